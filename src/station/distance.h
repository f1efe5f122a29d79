// Distance of two sites, for judging who is whose neighbour; not for weights.
#pragma once
#include <algorithm>
#include <cmath>

#include "windrow/base/angle.h"

namespace windrow::station {

/// Great circle on a sphere of 6371 km, haversine formula.
inline double distance_km(const GeoPoint& a, const GeoPoint& b) {
  const double phi1 = a.latitude.radians(), phi2 = b.latitude.radians();
  const double half_phi = std::sin((phi2 - phi1) / 2);
  const double half_lambda = std::sin((b.longitude.radians() - a.longitude.radians()) / 2);
  const double h = half_phi * half_phi + std::cos(phi1) * std::cos(phi2) * half_lambda * half_lambda;
  return 2 * 6371 * std::asin(std::sqrt(std::min(1.0, h)));
}

}  // namespace windrow::station
