// Ordinary kriging in bare matrices: Cholesky, weights, variance of any weights. No positions.
#include "kriging_system.h"

#include <algorithm>
#include <array>
#include <cmath>

namespace windrow::reach {
namespace {

using Lanes = std::array<double, kLanes>;

/// sum -= f * x, lane by lane.
void subtract(Lanes& sum, double f, const double* x) {
  for (std::size_t l = 0; l < kLanes; ++l) sum[l] -= f * x[l];
}

Lanes load(const double* x) {
  Lanes lanes{};
  std::copy(x, x + kLanes, lanes.begin());
  return lanes;
}

/// Rows solved together, so that each right side is loaded once for all of them.
constexpr std::size_t kRows = 4;

/// Rows i to i + R - 1 of x from those before (forward, with L) or after them (with its transpose).
template <std::size_t R, bool Forward>
void solve_rows(const double* both, std::size_t n, std::size_t i, double* x) {
  const double* row = both + i * n;
  std::array<Lanes, R> sum;
  for (std::size_t r = 0; r < R; ++r) sum[r] = load(x + (i + r) * kLanes);
  for (std::size_t k = Forward ? 0 : i + R; k < (Forward ? i : n); ++k) {
    for (std::size_t r = 0; r < R; ++r) subtract(sum[r], row[r * n + k], x + k * kLanes);
  }
  for (std::size_t step = 0; step < R; ++step) {
    const std::size_t r = Forward ? step : R - 1 - step;
    const double* own = row + r * n;
    for (std::size_t k = Forward ? i : i + r + 1; k < (Forward ? i + r : i + R); ++k) {
      subtract(sum[r], own[k], x + k * kLanes);
    }
    for (std::size_t l = 0; l < kLanes; ++l) x[(i + r) * kLanes + l] = sum[r][l] / own[i + r];
  }
}

}  // namespace

bool Cholesky::factor(const std::vector<double>& matrix, std::size_t n, double added_to_diagonal) {
  n_ = n;
  both_ = matrix;
  for (std::size_t k = 0; k < n; ++k) both_[k * n + k] += added_to_diagonal;
  for (std::size_t k = 0; k < n; ++k) {
    double* row = &both_[k * n];
    if (!(row[k] > kSmallestPivot * (matrix[k * n + k] + added_to_diagonal))) return false;
    const double root = std::sqrt(row[k]);
    for (std::size_t j = k; j < n; ++j) row[j] /= root;
    for (std::size_t i = k + 1; i < n; ++i) {
      double* below = &both_[i * n];
      const double f = row[i];
      for (std::size_t j = i; j < n; ++j) below[j] -= f * row[j];
    }
  }
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = 0; j < i; ++j) both_[i * n + j] = both_[j * n + i];
  }
  return true;
}

void Cholesky::solve(double* x) const {
  std::size_t i = 0;
  for (; i + kRows <= n_; i += kRows) solve_rows<kRows, true>(both_.data(), n_, i, x);
  for (; i < n_; ++i) solve_rows<1, true>(both_.data(), n_, i, x);
  for (; i >= kRows; i -= kRows) solve_rows<kRows, false>(both_.data(), n_, i - kRows, x);
  for (; i > 0; --i) solve_rows<1, false>(both_.data(), n_, i - 1, x);
}

void KrigingSystem::set(const std::vector<double>& covariance, std::size_t n, double sill) {
  n_ = n;
  jitter_ = 0;
  // Ends: once the addition exceeds the other elements' sum, the matrix is diagonally dominant.
  for (double next = kSmallestPivot; !factor_.factor(covariance, n, jitter_ * sill); next *= 10) jitter_ = next;
  std::vector<double> lanes(n * kLanes, 1.0);
  factor_.solve(lanes.data());
  unit_.resize(n);
  unit_sum_ = 0;
  for (std::size_t i = 0; i < n; ++i) unit_sum_ += unit_[i] = lanes[i * kLanes];
}

void KrigingSystem::weights(double* x, double* mu) const {
  factor_.solve(x);
  Lanes sum{};
  for (std::size_t i = 0; i < n_; ++i) subtract(sum, -1, x + i * kLanes);
  for (std::size_t l = 0; l < kLanes; ++l) mu[l] = (sum[l] - 1) / unit_sum_;
  for (std::size_t i = 0; i < n_; ++i) {
    for (std::size_t l = 0; l < kLanes; ++l) x[i * kLanes + l] -= mu[l] * unit_[i];
  }
}

void estimation_variance(const std::vector<double>& covariance, std::size_t n, double sill, const double* weights,
                         const double* to_point, double* out) {
  std::vector<std::size_t> used;
  for (std::size_t i = 0; i < n; ++i) {
    const double* w = weights + i * kLanes;
    if (std::any_of(w, w + kLanes, [](double v) { return v != 0; })) used.push_back(i);
  }
  Lanes total{};
  for (std::size_t a = 0; a < used.size(); ++a) {
    const std::size_t i = used[a];
    const double* row = &covariance[i * n];
    const double* w = weights + i * kLanes;
    // Half of w'Cw: the triangle, and half of the diagonal.
    Lanes sum = load(to_point + i * kLanes);
    for (std::size_t b = 0; b < a; ++b) subtract(sum, row[used[b]], weights + used[b] * kLanes);
    subtract(sum, row[i] / 2, w);
    for (std::size_t l = 0; l < kLanes; ++l) total[l] -= w[l] * sum[l];
  }
  for (std::size_t l = 0; l < kLanes; ++l) out[l] = std::max(0.0, sill + 2 * total[l]);
}

}  // namespace windrow::reach
