// Circles on the unit sphere and arcs of them: the only kind of edge there is.
#pragma once
#include "windrow/sphere/vec3.h"

namespace windrow::sphere {

/// The circle n.x = d; it runs in the positive sense about n, with the side n.x > d on its left. `radius` = sqrt(1 -
/// d²) and `versine` = 1 - |d| are kept beside d because they cannot be had from d without loss near a pole (1 -
/// sin(phi) computed plainly loses 2e-9 at 1 km from the pole).
struct Circle {
  Vec3 n{0, 0, 1};
  double d = 0;
  double radius = 1;
  double versine = 1;

  static Circle great(const Vec3& n) { return {n, 0.0, 1.0, 1.0}; }
  /// Parallel of latitude `phi` (degrees): n is the north pole.
  static Circle parallel_degrees(double phi);
  /// Great circle through both poles at longitude `lambda` (degrees): n points east of it.
  static Circle meridian_degrees(double lambda);
  /// The same circle run through the other way.
  [[nodiscard]] Circle reversed() const { return {-n, -d, radius, versine}; }
  bool operator==(const Circle&) const = default;
};

/// n.x - d without the loss that the plain form has where |d| is near 1: the error is about eps * radius there.
inline double height(const Circle& c, const Vec3& x) {
  if (c.d > 0.5) {
    const Vec3 r = x - c.n;
    return c.versine - 0.5 * dot(r, r);
  }
  if (c.d < -0.5) {
    const Vec3 r = x + c.n;
    return 0.5 * dot(r, r) - c.versine;
  }
  return dot(c.n, x) - c.d;
}

/// Part of a circle between two of its points. `dtheta` (radians, |dtheta| <= pi/2) is stored, never inferred from the
/// end points: positive in the sense of the circle, negative against it. Reversing an arc keeps its circle's bits.
struct Arc {
  Vec3 from, to;
  Circle circle;
  double dtheta = 0;
  [[nodiscard]] Arc reversed() const { return {to, from, circle, -dtheta}; }
  [[nodiscard]] double length() const { return circle.radius * std::abs(dtheta); }
};

/// Arc of under 90 degrees from `from` to `to` in the plane that stands at `tilt` = tan(angle) to the great circle's.
/// Positive tilt: the arc bulges to the left of the great circle.
Arc arc_through(const Vec3& from, const Vec3& to, double tilt);

/// Tangent of the angle between the great circle through `from` and `to` and the plane through `from`, `middle`, `to`:
/// all that has to be stored beside the ends to rebuild the arc. 0 for a great circle; its sign turns with the
/// direction.
double tilt_through(const Vec3& from, const Vec3& middle, const Vec3& to);

/// The point at fraction `f` (0..1) of the arc.
Vec3 point_on(const Arc& arc, double f);

}  // namespace windrow::sphere
