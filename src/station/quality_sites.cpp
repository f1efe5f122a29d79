// Checks of sites: the sign of a longitude, elevations against the relief. Which sites are used is not decided here.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "distance.h"
#include "windrow/station/quality.h"

namespace windrow::station {
namespace {

constexpr double kFarKm = 1000, kAmongKm = 300;
constexpr double kFarTimes = 10, kAmongTimes = 2;  // of the usual distance, so that a sparse network stays silent
constexpr std::size_t kLeastOthers = 3;
constexpr double kFoot = 0.3048;  // metres, exactly (international foot, 1959)

/// Distance to the nearest site but `self`.
double nearest_km(const GeoPoint& place, const std::vector<Site>& sites, std::size_t self) {
  double nearest = std::numeric_limits<double>::max();
  for (std::size_t i = 0; i < sites.size(); ++i) {
    if (i != self) nearest = std::min(nearest, distance_km(place, sites[i].position));
  }
  return nearest;
}

}  // namespace

std::vector<Finding> check_positions(const std::vector<Site>& sites) {
  std::vector<Finding> out;
  if (sites.size() <= kLeastOthers) return out;
  std::vector<double> own;
  for (std::size_t i = 0; i < sites.size(); ++i) own.push_back(nearest_km(sites[i].position, sites, i));
  std::vector<double> usual = own;
  const auto middle = usual.begin() + static_cast<std::ptrdiff_t>(usual.size() / 2);
  std::nth_element(usual.begin(), middle, usual.end());
  for (std::size_t i = 0; i < sites.size(); ++i) {
    if (own[i] <= std::max(kFarKm, kFarTimes * *middle)) continue;
    const GeoPoint& at = sites[i].position;
    const double longitude = at.longitude.degrees() > 180 ? at.longitude.degrees() - 360 : at.longitude.degrees();
    const double turned = nearest_km({Angle::degrees(-longitude), at.latitude}, sites, i);
    if (turned > std::max(kAmongKm, kAmongTimes * *middle) || turned >= own[i]) continue;
    out.push_back({sites[i].id, "", Fault::longitude_sign, "", 1,
                   fmt::format("station '{}' at longitude {:.6g} is {:.0f} km from any other; at {:.6g} it would stand "
                               "among them ({:.0f} km): the sign may be wrong",
                               sites[i].id, longitude, own[i], -longitude, turned)});
  }
  return out;
}

std::vector<Finding> check_elevations(const std::vector<Site>& sites, const std::vector<double>& relief_m,
                                      double most_m) {
  std::vector<Finding> out;
  for (std::size_t i = 0; i < sites.size() && i < relief_m.size(); ++i) {
    const double given = sites[i].elevation_m, difference = given - relief_m[i];
    if (std::isnan(difference) || std::abs(difference) <= most_m) continue;
    const auto fits = [&](double metres) { return std::abs(metres - relief_m[i]) <= 0.5 * most_m; };
    const char* feet = fits(given * kFoot) ? "; read as feet it would fit" : "";
    out.push_back({sites[i].id, "", Fault::elevation, "", 1,
                   fmt::format("station '{}' has the elevation {:.6g} m where the relief has {:.0f} m{}", sites[i].id,
                               given, relief_m[i], feet)});
  }
  return out;
}

}  // namespace windrow::station
