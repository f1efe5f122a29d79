// Distances, tapers and the stations near a cell. No weights.
#include "rows.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>

#include "windrow/base/constants.h"

namespace windrow::reach {

Vector unit_vector(GeoPoint p) {
  const double phi = p.latitude.radians();
  const double lambda = p.longitude.radians();
  return {std::cos(phi) * std::cos(lambda), std::cos(phi) * std::sin(lambda), std::sin(phi)};
}

double haversine(const Vector& a, const Vector& b) {
  const double x = a[0] - b[0];
  const double y = a[1] - b[1];
  const double z = a[2] - b[2];
  return (x * x + y * y + z * z) / 4;
}

double arc_m(double haversine_of_angle) {
  const double h = std::clamp(haversine_of_angle, 0.0, 1.0);
  return 2 * kEarthRadius_m * std::atan2(std::sqrt(h), std::sqrt(1 - h));
}

double model_distance_m(Variogram::Model model, double haversine_of_angle) {
  return model == Variogram::Model::gaussian ? 2 * kEarthRadius_m * std::sqrt(haversine_of_angle)
                                             : arc_m(haversine_of_angle);
}

double taper(double t) {
  const double rest = t < 1 ? 1 - t * t : 0;
  return rest * rest;
}

double fade_of(double nearest_m, double radius_m) {
  const double x = std::clamp((nearest_m - radius_m / 2) / (radius_m / 2), 0.0, 1.0);
  return (1 - x) * (1 - x) * (1 + 2 * x);
}

Neighbourhood::Neighbourhood(const std::vector<Vector>& stations, const Options& options)
    : stations_(stations), options_(options) {
  const double half_angle = options.radius_m / (2 * kEarthRadius_m);
  const double s = half_angle < std::numbers::pi / 2 ? std::sin(half_angle) : 1;
  // A margin of rounding; the taper and the fade decide at the radius itself.
  limit_ = s * s * (1 + 1e-12);
}

void Neighbourhood::find(const Vector& cell) {
  near_.clear();
  for (std::size_t j = 0; j < stations_.size(); ++j) {
    const double h = haversine(cell, stations_[j]);
    if (h <= limit_) near_.push_back({h, static_cast<std::uint32_t>(j)});
  }
  cut_ = options_.radius_m;
  const auto wanted = static_cast<std::size_t>(std::max(options_.neighbours, 1));
  if (stations_.size() > static_cast<std::size_t>(kAllStations) && near_.size() > wanted) {
    const auto first_unused = near_.begin() + static_cast<std::ptrdiff_t>(wanted);
    std::nth_element(near_.begin(), first_unused, near_.end());
    cut_ = std::min(cut_, arc_m(first_unused->haversine));
    near_.erase(first_unused, near_.end());
    std::sort(near_.begin(), near_.end(), [](const Neighbour& a, const Neighbour& b) { return a.station < b.station; });
  }
}

Neighbour Neighbourhood::nearest() const {
  return near_.empty() ? Neighbour{std::numeric_limits<double>::infinity(), 0}
                       : *std::min_element(near_.begin(), near_.end());
}

}  // namespace windrow::reach
