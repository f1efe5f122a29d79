#include "windrow/base/exact_sum.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>

namespace windrow {

BinnedSum::Bins BinnedSum::bins(double bound, std::uint64_t terms) {
  bound = std::max(bound, std::numeric_limits<double>::min());
  int exponent = 0;
  std::frexp(bound, &exponent);  // bound <= 2^exponent
  const int log_terms = terms <= 1 ? 0 : static_cast<int>(std::bit_width(terms - 1));
  // terms * bound <= 2^(exponent + log_terms) = 2^52 * q1
  const int q1 = std::max(exponent + log_terms - 52, -960);
  // rests are at most q1 / 2: terms * q1 / 2 <= 2^52 * q2
  const int q2 = std::max(q1 - 1 + log_terms - 52, -1022);
  return {1.5 * std::ldexp(1.0, 52 + q1), 1.5 * std::ldexp(1.0, 52 + q2)};
}

namespace {
__extension__ typedef unsigned __int128 Wide;
constexpr int kBias = 1088;  // exponent of limb 0's lowest bit is -kBias
}

void ExactSum::add(double x) {
  if (!std::isfinite(x)) {
    invalid_ = true;
    return;
  }
  if (x == 0) return;
  const auto bits = std::bit_cast<std::uint64_t>(x);
  const int field = static_cast<int>((bits >> 52) & 0x7ff);
  std::uint64_t mantissa = bits & ((1ULL << 52) - 1);
  if (field != 0) mantissa |= 1ULL << 52;
  const int exponent = (field == 0 ? 1 : field) - 1075 + kBias;  // of the mantissa's lowest bit
  const int index = exponent / 32, shift = exponent % 32;
  const auto wide = static_cast<Wide>(mantissa) << shift;
  const std::int64_t sign = (bits >> 63) != 0 ? -1 : 1;
  for (int k = 0; k < 3; ++k) {
    limb_[index + k] += sign * static_cast<std::int64_t>(static_cast<std::uint32_t>(wide >> (32 * k)));
  }
  if (++pending_ >= (1 << 29)) normalise();
}

void ExactSum::add(const ExactSum& other) {
  ExactSum copy = other;
  copy.normalise();
  normalise();
  for (int i = 0; i < kLimbs; ++i) limb_[i] += copy.limb_[i];
  pending_ = 2;
  invalid_ = invalid_ || other.invalid_;
}

void ExactSum::normalise() {
  for (int i = 0; i + 1 < kLimbs; ++i) {
    const std::int64_t carry = limb_[i] >> 32;  // floor
    limb_[i] -= carry * (1LL << 32);
    limb_[i + 1] += carry;
  }
  pending_ = 0;
}

double ExactSum::value() const {
  if (invalid_) return std::numeric_limits<double>::quiet_NaN();
  ExactSum copy = *this;
  copy.normalise();
  const bool negative = copy.limb_[kLimbs - 1] < 0;
  if (negative) {
    for (auto& limb : copy.limb_) limb = -limb;
    copy.normalise();
  }
  int top = kLimbs - 1;
  while (top >= 0 && copy.limb_[top] == 0) --top;
  if (top < 0) return 0.0;
  // Three limbs hold 65..96 significant bits; everything below only matters as a sticky bit for rounding to nearest even.
  Wide head = 0;
  for (int i = top; i > top - 3; --i) {
    head = (head << 32) | (i >= 0 ? static_cast<std::uint32_t>(copy.limb_[i]) : 0U);
  }
  bool sticky = false;
  for (int i = top - 3; i >= 0; --i) sticky = sticky || copy.limb_[i] != 0;
  int width = 0;
  while ((head >> width) != 0) ++width;
  const int drop = width - 53;
  auto mantissa = static_cast<std::uint64_t>(head >> drop);
  const Wide rest = head & ((static_cast<Wide>(1) << drop) - 1);
  const Wide half = static_cast<Wide>(1) << (drop - 1);
  if (rest > half || (rest == half && (sticky || (mantissa & 1) != 0))) ++mantissa;
  const double magnitude = std::ldexp(static_cast<double>(mantissa), drop + 32 * (top - 2) - kBias);
  return negative ? -magnitude : magnitude;
}

}  // namespace windrow
