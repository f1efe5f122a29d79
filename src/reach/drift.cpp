// The change with height that all stations share, by generalised least squares.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "kriging.h"
#include "windrow/base/error.h"
#include "windrow/reach/variogram.h"

namespace windrow::reach {
namespace {

constexpr double kLeastSpan_m = 300;
constexpr std::size_t kFewestStations = 5;
constexpr double kLeastNugget = 0.01;

/// K^-1 1 and K^-1 z; the plain vectors without a variogram.
struct Weighted {
  std::vector<double> one, height;
};

Weighted weigh(const std::vector<Vector>& at, const std::vector<double>& height,
               const std::optional<Variogram>& variogram, std::vector<double> noise) {
  const std::size_t n = at.size();
  Weighted out{std::vector<double>(n, 1.0), height};
  if (!variogram) return out;
  for (double& v : noise) v += std::max(variogram->nugget, kLeastNugget * variogram->sill);
  KrigingSystem system;
  system.set(site_covariance(at, noise, *variogram), n, variogram->sill);
  std::vector<double> lanes(n * kLanes, 0);
  for (std::size_t i = 0; i < n; ++i) {
    lanes[i * kLanes] = 1;
    lanes[i * kLanes + 1] = height[i];
  }
  system.solve(lanes.data());
  for (std::size_t i = 0; i < n; ++i) {
    out.one[i] = lanes[i * kLanes];
    out.height[i] = lanes[i * kLanes + 1];
  }
  return out;
}

}  // namespace

Drift fit_drift(const std::vector<double>& elevation_m, const std::vector<double>& values, std::size_t width,
                const std::vector<GeoPoint>& positions, const std::optional<Variogram>& variogram,
                const std::vector<double>& noise, Notices& notices) {
  const std::size_t all = positions.size();
  if (elevation_m.size() != all || values.size() != all * width || (!noise.empty() && noise.size() != all)) {
    throw Error(Failure::defect, "height drift", "heights, values or sampling variances do not fit the stations");
  }
  if (variogram) check(*variogram);
  Drift drift;
  drift.slope.assign(width, 0);
  std::vector<std::size_t> stations;
  std::vector<Vector> at;
  std::vector<double> height, own;
  for (std::size_t i = 0; i < all; ++i) {
    const auto* row = values.data() + i * width;
    if (!std::isfinite(elevation_m[i]) || !std::all_of(row, row + width, [](double v) { return std::isfinite(v); })) {
      continue;
    }
    stations.push_back(i);
    at.push_back(unit_vector(positions[i]));
    height.push_back(elevation_m[i]);
    own.push_back(noise.empty() ? 0 : noise[i]);
  }
  if (stations.size() < kFewestStations) {
    notices.add("height drift", fmt::format("not used: {} stations with a height, at least {} are needed",
                                            stations.size(), kFewestStations));
    return drift;
  }
  const auto ends = std::minmax_element(height.begin(), height.end());
  drift.low_m = *ends.first;
  drift.high_m = *ends.second;
  if (drift.high_m - drift.low_m < kLeastSpan_m) {
    notices.add("height drift", fmt::format("not used: the stations' heights span {:.0f} m, under {:.0f} m",
                                            drift.high_m - drift.low_m, kLeastSpan_m));
    return drift;
  }
  // About the middle, so that the two unknowns are nearly independent.
  for (double& z : height) z -= (drift.low_m + drift.high_m) / 2;
  const Weighted k = weigh(at, height, variogram, own);
  double s11 = 0, s12 = 0, s22 = 0;
  for (std::size_t i = 0; i < height.size(); ++i) {
    s11 += k.one[i];
    s12 += k.height[i];
    s22 += k.height[i] * height[i];
  }
  for (std::size_t c = 0; c < width; ++c) {
    double one = 0, up = 0;
    for (std::size_t i = 0; i < height.size(); ++i) {
      const double y = values[stations[i] * width + c];
      one += k.one[i] * y;
      up += k.height[i] * y;
    }
    drift.slope[c] = (s11 * up - s12 * one) / (s11 * s22 - s12 * s12);
  }
  drift.used = true;
  return drift;
}

double drift_height(const Drift& drift, double height_m) {
  if (std::isnan(height_m)) return height_m;
  return std::clamp(height_m, drift.low_m, drift.high_m);
}

}  // namespace windrow::reach
