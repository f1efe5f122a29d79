// How mesh coordinates reach the globe: a callback for projections and the earth's shape.
#pragma once
#include <functional>
#include <vector>

namespace windrow::mesh {

/// Takes mesh coordinates to geodetic degrees, in place: x -> longitude, y -> latitude. A point the projection cannot
/// reach becomes NaN. Thread-safe.
using Projector = std::function<void(std::vector<double>& x, std::vector<double>& y)>;

/// How latitude is understood: on the sphere as given, or geodetic on an ellipsoid and turned into authalic latitude
/// (Snyder 1987, PP 1395, eqs 3-11, 3-12), so that areas are those of the ellipsoid.
struct Earth {
  double radius_m = 6371007.1809;  ///< sphere radius, or the ellipsoid's authalic radius
  double e2 = 0;                   ///< first eccentricity squared; 0: sphere
  bool operator==(const Earth&) const = default;
  static Earth sphere(double radius_m);
  static Earth ellipsoid(double semi_major_m, double inverse_flattening);
};
double authalic_latitude_deg(double geodetic_deg, double e2);
/// The way back, within a few eps * 90 degrees.
double geodetic_latitude_deg(double authalic_deg, double e2);

}  // namespace windrow::mesh
