// Invented points and random numbers for the tests of the reach; seeds are the caller's. Test use only.
#pragma once
#include <algorithm>
#include <cmath>
#include <numbers>
#include <random>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/reach/reach.h"

namespace windrow::reach {

inline GeoPoint at(double longitude, double latitude) { return {Angle::degrees(longitude), Angle::degrees(latitude)}; }

inline GeoPoint north_of(GeoPoint p, double degrees) {
  return {p.longitude, Angle::radians(p.latitude.radians() + Angle::degrees(degrees).radians())};
}

/// Uniform in [0, 1) and standard normal (Box-Muller): the same numbers from every standard library.
class Random {
 public:
  explicit Random(unsigned seed) : random_(seed) {}
  double uniform() { return static_cast<double>(random_() >> 11) * 0x1p-53; }
  double normal() {
    const double radius = std::sqrt(-2 * std::log(1 - uniform()));
    return radius * std::cos(2 * std::numbers::pi * uniform());
  }

 private:
  std::mt19937_64 random_;
};

inline std::vector<GeoPoint> random_points(int n, double span, unsigned seed) {
  Random random(seed);
  std::vector<GeoPoint> points;
  for (int i = 0; i < n; ++i) {
    const double longitude = 10 + span * random.uniform();
    points.push_back(at(longitude, 45 + span * random.uniform()));
  }
  return points;
}

/// Sum of shares times values of a row.
inline double row_value(const ReachMap& reach, std::size_t row, const std::vector<double>& values) {
  double sum = 0;
  for (auto p = reach.map.row_start[row]; p < reach.map.row_start[row + 1]; ++p) {
    sum += reach.map.share[p] * values[reach.map.column[p]];
  }
  return sum;
}

/// Value carried to row i, faded to `background` like a caller does.
inline double carried(const ReachMap& reach, std::size_t row, const std::vector<double>& values, double background) {
  return reach.fade[row] * row_value(reach, row, values) + (1 - reach.fade[row]) * background;
}

/// Largest change of the carried value between neighbouring points of a straight path in longitude and latitude.
inline double largest_step(const std::vector<GeoPoint>& stations, const Options& options, GeoPoint from, GeoPoint to,
                           int steps, const std::vector<double>& values) {
  std::vector<GeoPoint> path;
  for (int i = 0; i <= steps; ++i) {
    const double t = static_cast<double>(i) / steps;
    path.push_back(at(from.longitude.degrees() * (1 - t) + to.longitude.degrees() * t,
                      from.latitude.degrees() * (1 - t) + to.latitude.degrees() * t));
  }
  const ReachMap reach = make_reach(stations, path, options);
  double largest = 0;
  for (std::size_t i = 1; i < path.size(); ++i) {
    largest = std::max(largest, std::abs(carried(reach, i, values, 0.5) - carried(reach, i - 1, values, 0.5)));
  }
  return largest;
}

}  // namespace windrow::reach
