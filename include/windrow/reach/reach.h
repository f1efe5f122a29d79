// Carrying values from stations to mesh cells: stations x cells -> LinearMap.
#pragma once
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/linear_map/linear_map.h"

namespace windrow::reach {

enum class Method { nearest, inverse_distance };

struct Options {
  Method method = Method::inverse_distance;
  double radius_m = 300e3;
  double power = 2;
  int neighbours = 32;  ///< nearest stations used when there are more than kAllStations; 1 makes seams, like nearest
};
/// Up to so many stations all are used, whatever `neighbours` says: the taper at the radius alone limits them.
inline constexpr int kAllStations = 500;

/// Shares of a row sum to 1, or the row is empty (no station within the radius). Columns are stations.
struct ReachMap {
  linear_map::LinearMap map;
  std::vector<double> fade;  ///< rows: 1 near stations, smoothly down to 0 where the nearest one is `radius` away
};

/// Great-circle distance in metres on the sphere of kEarthRadius_m (haversine; atan2 form).
double distance_m(GeoPoint a, GeoPoint b);

/// Weight of a station at distance > 0 before any taper: distance^-power (Shepard 1968).
double shepard_weight(double distance, double power);

/// inverse-distance (Shepard 1968): w = d^-p, times a taper that is 1 at the point and reaches zero with zero slope at
/// the radius (or at the first station not used), so that no seams show. A station at the point (under 1 m) takes all;
/// co-located stations share. Nearest: the nearest station takes all; ties go to the lower number. The fade is 1 up to
/// half the radius and falls from there to 0 at the radius with zero slope at both ends: (1-x)^2 (1+2x). Cost: stations
/// x cells distances; the result does not depend on the number of threads.
ReachMap make_reach(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options);

}  // namespace windrow::reach
