// Random numbers, and fields of weather that hang together in space and time. The same bytes on every machine: only
// + - * / and square roots, numbers drawn by counter (seed, node, day), no library distribution.
#pragma once
#include <cstdint>
#include <vector>

namespace demo {

/// splitmix64 (Steele, Lea & Flood 2014, OOPSLA) of a counter made of three numbers.
std::uint64_t draw(std::uint64_t seed, std::uint64_t a, std::uint64_t b);
double uniform(std::uint64_t seed, std::uint64_t a, std::uint64_t b);  ///< [0, 1)
/// About normal: the sum of eight 16-bit uniforms, standardised (tails end near 4.9 deviations).
double normal(std::uint64_t seed, std::uint64_t a, std::uint64_t b);

/// A year's wave, 1 at its crest and -1 half a year later, made of two parabolas. `phase` in years.
double wave(double phase);

/// One place's (or cell's) share in the nodes of a field.
struct Share {
  std::vector<int> node;
  std::vector<double> weight;
};

/// Nodes on a regular grid over the demo's region, each a first-order autoregressive series of unit variance.
class WeatherField {
 public:
  WeatherField(double node_spacing_deg, double memory, std::uint64_t seed);
  void next_day();
  /// Cubic B-spline weights of a point, scaled so that the value there has unit variance.
  [[nodiscard]] Share point(double lon, double lat) const;
  /// Mean over a cell: 4 x 4 points.
  [[nodiscard]] Share cell(double west, double south, double step) const;
  [[nodiscard]] double value(const Share& share) const;

 private:
  double spacing_, memory_, innovation_;
  std::uint64_t seed_, day_ = 0;
  int columns_, rows_;
  std::vector<double> state_;
};

}  // namespace demo
