// Where two circles cross. Kept apart from clipping because its bits are a promise between neighbouring cells.
#include <algorithm>
#include <tuple>

#include "windrow/sphere/clip.h"

namespace windrow::sphere {
namespace {

// A circle and its reverse are one set of points: the first non-zero component of n is made positive.
bool runs_backward(const Circle& c) {
  if (c.n.x != 0) return c.n.x < 0;
  if (c.n.y != 0) return c.n.y < 0;
  return c.n.z < 0;
}

// Smaller circle first: then its own radius, not the difference of numbers near 1, decides where on it the crossing is.
bool precedes(const Circle& a, const Circle& b) {
  return std::tie(a.radius, a.n.x, a.n.y, a.n.z, a.d) < std::tie(b.radius, b.n.x, b.n.y, b.n.z, b.d);
}

Vec3 any_perpendicular(const Vec3& n) {
  return unit(std::abs(n.x) < 0.6 ? cross(n, Vec3{1, 0, 0}) : cross(n, Vec3{0, 1, 0}));
}

// d2 - c d1, c = n1.n2. Two small circles close together need their versines: all three numbers are near +-1 then.
double apart(const Circle& first, const Circle& second, double c) {
  const double sign = c > 0 ? 1.0 : -1.0;
  if (std::abs(c) < 0.5 || sign * first.d * second.d < 0.25) return second.d - c * first.d;
  const Vec3 r = first.n - sign * second.n;
  return (second.d > 0 ? 1.0 : -1.0) * (first.versine - second.versine) + 0.5 * sign * first.d * dot(r, r);
}

}  // namespace

Crossings crossings(const Circle& a, const Circle& b) {
  const bool a_backward = runs_backward(a);
  const bool b_backward = runs_backward(b);
  Circle first = a_backward ? a.reversed() : a;
  Circle second = b_backward ? b.reversed() : b;
  const bool swapped = precedes(second, first);
  if (swapped) std::swap(first, second);

  // x = d1 n1 + q e + g w, with w along n1 x n2 and e = w x n1. Making w exactly perpendicular to n1 keeps n1.x - d1
  // and n2.x - d2 within a few eps however nearly parallel the planes are; only the place along the arcs suffers.
  const Vec3 product = cross(first.n, second.n);
  const double s = norm(product);
  Vec3 w = s > 0 ? (1 / s) * product : any_perpendicular(first.n);
  w = unit(w - dot(w, first.n) * first.n);
  const Vec3 e = cross(w, first.n);
  const double c = dot(first.n, second.n);
  const double reach = s > 0 ? apart(first, second, c) / s : 0.0;
  const double q = std::clamp(reach, -first.radius, first.radius);
  const double g = std::sqrt((first.radius - q) * (first.radius + q));
  const Vec3 base = first.d * first.n + q * e;
  const Vec3 plus = base + g * w;
  const Vec3 minus = base - g * w;
  // Along a, the height above b changes by x.(nb x na): it falls where x.(na x nb) > 0.
  const bool along_product = (a_backward != b_backward) == swapped;
  return along_product ? Crossings{plus, minus} : Crossings{minus, plus};
}

}  // namespace windrow::sphere
