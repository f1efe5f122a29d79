// The plane that touches the sphere at a place, seen from the sphere's centre: great circles are straight lines there.
#pragma once
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

}  // namespace windrow::overlap
