// The exponential function from + - * / alone, so that tile code gives the same bits with every library. No libm here.
#pragma once
#include <bit>
#include <cstdint>

namespace windrow::adjust {

/// e^x with a relative error below 1e-15 for |x| <= 700 (beyond, x is clamped: logarithms of targets never come near);
/// NaN stays NaN. x = k ln 2 + r, |r| <= ln 2 / 2: Taylor sum to r^13 (remainder 4e-18), scaled by 2^k through the
/// exponent bits.
inline double det_exp(double x) {
  if (!(x == x)) return x;
  if (x > 700) x = 700;
  if (x < -700) x = -700;
  constexpr double kPerLn2 = 1.4426950408889634;
  // ln 2 in two parts; the first has 20 trailing zero bits, so k times it is exact.
  constexpr double kLn2High = 0x1.62e42fefp-1;
  constexpr double kLn2Low = 0x1.473de6af278edp-34;
  const double scaled = x * kPerLn2;
  const auto k = static_cast<std::int64_t>(scaled < 0 ? scaled - 0.5 : scaled + 0.5);
  const double r = (x - static_cast<double>(k) * kLn2High) - static_cast<double>(k) * kLn2Low;
  double sum = 1;
  for (int n = 13; n >= 1; --n) sum = 1 + sum * r / n;
  return sum * std::bit_cast<double>(static_cast<std::uint64_t>(1023 + k) << 52);
}

}  // namespace windrow::adjust
