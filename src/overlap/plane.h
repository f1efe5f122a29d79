// The plane that touches the sphere at a place, seen from the sphere's centre: great circles are straight lines there.
#pragma once
#include <algorithm>

#include "centres.h"

namespace windrow::overlap {

struct PlanePoint {
  double x = 0, y = 0;
};

/// Gnomonic projection about a place, which is the origin.
class Plane {
 public:
  explicit Plane(const sphere::Vec3& place) : place_(place) { tangents(place, first_, second_); }
  /// Only points well on the near side have a useful image.
  [[nodiscard]] bool near_side(const sphere::Vec3& p) const { return dot(p, place_) > 0.05; }
  [[nodiscard]] PlanePoint operator()(const sphere::Vec3& p) const {
    const sphere::Vec3 off = p - place_;
    const double scale = 1 / dot(p, place_);
    return {scale * dot(off, first_), scale * dot(off, second_)};
  }

 private:
  sphere::Vec3 place_, first_, second_;
};

/// How far along from a to b (0..1) the point nearest to the origin lies, and the square of its distance.
struct Foot {
  double along = 0, distance2 = 0;
};
inline Foot foot_of_origin(const PlanePoint& a, const PlanePoint& b) {
  const double dx = b.x - a.x, dy = b.y - a.y, length2 = dx * dx + dy * dy;
  const double f = length2 > 0 ? std::clamp(-(a.x * dx + a.y * dy) / length2, 0.0, 1.0) : 0.0;
  const double x = a.x + f * dx, y = a.y + f * dy;
  return {f, x * x + y * y};
}

}  // namespace windrow::overlap
