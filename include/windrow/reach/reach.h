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
  int neighbours = 32;  ///< up to 500 stations all are used
};

/// Shares of a row sum to 1, or the row is empty (no station within the radius). Columns are stations.
struct ReachMap {
  linear_map::LinearMap map;
  std::vector<double> fade;  ///< rows: 1 near stations, smoothly down to 0 where the nearest one is `radius` away
};

/// Great-circle distance in metres on the sphere of kEarthRadius_m (haversine; atan2 form).
double distance_m(GeoPoint a, GeoPoint b);

/// inverse-distance (Shepard 1968): w = d^-p, times a taper that is 1 at the point and reaches zero with zero slope at
/// the radius (or at the first station not used), so that no seams show. A station at the point (under 1 m) takes all;
/// co-located stations share. Nearest: the nearest station takes all; ties go to the lower number.
ReachMap make_reach(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options);

}  // namespace windrow::reach
