// Ordinary kriging in bare matrices: covariances in, weights out, many points at once. Knows no globe; private.
#pragma once
#include <cstddef>
#include <vector>

namespace windrow::reach {

/// Points solved together. Each lane is computed as if alone, so its bits do not depend on its companions (why this is
/// not a library's matrix product); the loop over lanes is what fills the vector registers. Four keep 500 stations'
/// right sides in the first-level cache.
inline constexpr std::size_t kLanes = 4;

/// Cholesky factor of a symmetric positive definite matrix.
class Cholesky {
 public:
  /// n x n, row-major. False when a pivot falls below kSmallestPivot of its diagonal element.
  bool factor(const std::vector<double>& matrix, std::size_t n, double added_to_diagonal);
  /// x: n x kLanes, right sides in, solutions out.
  void solve(double* x) const;

 private:
  std::size_t n_ = 0;
  std::vector<double> both_;  ///< n x n: L below the diagonal, its transpose above
};
inline constexpr double kSmallestPivot = 1e-12;

/// The covariances between stations, factorised.
class KrigingSystem {
 public:
  /// covariance: n x n, with the nugget and the stations' own noise on the diagonal. `sill` scales the jitter.
  void set(const std::vector<double>& covariance, std::size_t n, double sill);
  /// x: n x kLanes; in: covariances with the points; out: weights, which sum to 1 in each lane.
  /// mu: kLanes, as in sum_j w_j C_ij + mu = C_i0.
  void weights(double* x, double* mu) const;
  /// K^-1 x for x: n x kLanes.
  void solve(double* x) const { factor_.solve(x); }
  /// What had to be added to the diagonal, in units of the sill.
  [[nodiscard]] double jitter() const { return jitter_; }

 private:
  std::size_t n_ = 0;
  Cholesky factor_;
  double jitter_ = 0;
  std::vector<double> unit_;  ///< n; K^-1 1
  double unit_sum_ = 0;
};

/// w'Cw - 2 w'c0 + sill of any weights summing to 1. covariance n x n; weights, to_point n x kLanes; out kLanes.
/// Rows without weight in any lane cost nothing.
void estimation_variance(const std::vector<double>& covariance, std::size_t n, double sill, const double* weights,
                         const double* to_point, double* out);

}  // namespace windrow::reach
