// Sums whose result does not depend on the order of the terms: what tiles, threads and parts add up is the same bits.
#pragma once
#include <cstddef>
#include <cstdint>

namespace windrow {

/// Order-independent sum of a known number of terms of bounded size, by pre-rounding into two bins (the idea of
/// Demmel & Nguyen 2013, "Fast reproducible floating-point summation", ARITH 21; from memory, own derivation below).
///
/// With at most `terms` values of |x| <= `bound`, q1 = 2^e1 is chosen so that terms * bound <= 2^52 * q1. Each x is split
/// into a multiple of q1 (x + M) - M, M = 1.5 * 2^52 * q1, and a rest |r| <= q1 / 2, which is split again with
/// q2 so that terms * q1 / 2 <= 2^52 * q2. Every partial sum of multiples of q1 stays below 2^53 * q1, so it is exact
/// in any order; likewise for q2. What is lost is below q2 / 2 a term.
/// Law: error <= terms * q2 / 2 <= terms^2 * bound * 2^-102, e.g. 4e-17 relative to `bound` for 2^24 terms.
class BinnedSum {
 public:
  struct Bins {
    double m1 = 0, m2 = 0;  ///< rounding constants
    /// Error-free split of one term; both parts add up exactly in any order.
    void split(double x, double& high, double& low) const {
      high = (x + m1) - m1;
      low = ((x - high) + m2) - m2;
    }
  };
  /// `bound` > 0 and finite; terms >= 1. A bound of 0 (an all-zero field) is taken as the smallest normal number.
  static Bins bins(double bound, std::uint64_t terms);

  explicit BinnedSum(Bins bins) : bins_(bins) {}
  void add(double x) {
    double high, low;
    bins_.split(x, high, low);
    high_ += high;
    low_ += low;
  }
  [[nodiscard]] double high() const { return high_; }
  [[nodiscard]] double low() const { return low_; }
  [[nodiscard]] double value() const { return high_ + low_; }

 private:
  Bins bins_;
  double high_ = 0, low_ = 0;
};

/// Sum of any doubles, correctly rounded whatever the order (fixed-point accumulator over the whole exponent range).
/// Slow (some ten nanoseconds a term): for sums once a map or product, not for tiles.
class ExactSum {
 public:
  void add(double x);
  void add(const ExactSum& other);
  [[nodiscard]] double value() const;  ///< NaN when a NaN or infinity was added

 private:
  void normalise();
  static constexpr int kLimbs = 68;  ///< 32 bits each: 2^-1088 .. 2^1088
  std::int64_t limb_[kLimbs] = {};
  int pending_ = 0;
  bool invalid_ = false;
};

}  // namespace windrow
