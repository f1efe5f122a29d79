// Areas of arcs, triangles and loops. No clipping, no grids.
#include "windrow/sphere/area.h"

#include <algorithm>
#include <limits>
#include <numbers>

namespace windrow::sphere {
namespace {

constexpr double kPi = std::numbers::pi;
constexpr double kSeriesBelow = 0.05;  // rad

// Lens of a positive arc on a circle with d > 0. Derivative in theta: d q / (1 - q), q = r² sin²(theta/2), whence the
// series  d r² theta³/12 [1 + c2 theta² + c4 theta⁴ + c6 theta⁶ + R], r² = 1 - d².  Its next coefficient is below 3e-4
// in size for all d, so |R| < 3e-4 * 0.05^8 = 1.2e-14 of a lens that is itself below theta²/24 of the sector's width.
double lens_positive(const Circle& c, double theta) {
  const double d = std::abs(c.d);
  if (theta < kSeriesBelow) {
    const double r2 = c.radius * c.radius;
    const double t2 = theta * theta;
    const double c2 = (3 * r2 - 1) / 20;
    const double c4 = 1.0 / 840 - r2 / 56 + r2 * r2 * 3 / 112;
    const double c6 = -1.0 / 60480 + r2 * (1.0 / 960 + r2 * (-5.0 / 960 + r2 * 5.0 / 960));
    return d * r2 * theta * t2 / 12 * (1 + t2 * (c2 + t2 * (c4 + t2 * c6)));
  }
  const double t = c.versine / (2 - c.versine);
  return theta * c.versine - 2 * std::atan2(t * std::sin(theta), 1 + t * std::cos(theta));
}

// Where the fan starts: the first vertex, unless the loop is so wide that a triangle could be degenerate (a vertex near
// its antipode); then the direction of the loop's vector area, which lies inside.
Vec3 fan_apex(const Loop& loop) {
  const Vec3& first = loop.front().from;
  const bool narrow = std::all_of(loop.begin(), loop.end(), [&](const Arc& a) { return dot(first, a.from) > -0.5; });
  if (narrow) return first;
  Vec3 sum;
  for (std::size_t k = 0; k < loop.size(); ++k) {
    sum = sum + cross(loop[k].from, loop[(k + 1) % loop.size()].from);
  }
  return norm(sum) > 0 ? unit(sum) : first;
}

// theta - sin(theta) without loss on short arcs; at 0.5 rad the first term left out is 1e-18 of the result.
double angle_less_sine(double theta) {
  if (std::abs(theta) > 0.5) return theta - std::sin(theta);
  const double t2 = theta * theta;
  return theta * t2 / 6 * (1 - t2 / 20 * (1 - t2 / 42 * (1 - t2 / 72 * (1 - t2 / 110 * (1 - t2 / 156 * (1 - t2 / 210))))));
}

double edge_length(const Piece& piece) {
  double length = 0;
  for (const Loop& loop : piece.loops) {
    for (const Arc& arc : loop) length += arc.length();
  }
  return length;
}

}  // namespace

double lens_area(const Circle& circle, double dtheta) {
  if (circle.d == 0 || dtheta == 0) return 0;
  const double lens = lens_positive(circle, std::abs(dtheta));
  return (circle.d > 0) == (dtheta > 0) ? lens : -lens;
}

double triangle_area(const Vec3& a, const Vec3& b, const Vec3& c) {
  return 2 * std::atan2(dot(a, cross(b - a, c - a)), 1 + dot(a, b) + dot(b, c) + dot(c, a));
}

double loop_area(const Loop& loop) {
  if (loop.size() < 2) return 0;
  const Vec3 apex = fan_apex(loop);
  // Half the areas of the triangles are the arguments of complex numbers; one arc tangent of their product adds them
  // modulo 4 pi, and small imaginary parts keep their relative accuracy in a product.
  double re = 1;
  double im = 0;
  double lenses = 0;
  Vec3 b = loop.back().from - apex;
  double apex_b = dot(apex, loop.back().from);
  for (std::size_t k = 0; k < loop.size(); ++k) {
    const Arc& previous = loop[k == 0 ? loop.size() - 1 : k - 1];
    const Vec3 c = loop[k].from - apex;
    const double apex_c = dot(apex, loop[k].from);
    const double numerator = dot(apex, cross(b, c));
    const double denominator = 1 + apex_b + apex_c + dot(previous.from, loop[k].from);
    if (numerator != 0) {
      const double re_new = re * denominator - im * numerator;
      im = re * numerator + im * denominator;
      re = re_new;
      if (std::abs(re) + std::abs(im) > 0x1p+500) {
        re *= 0x1p-500;
        im *= 0x1p-500;
      }
    }
    b = c;
    apex_b = apex_c;
    lenses += lens_area(loop[k].circle, loop[k].dtheta);
  }
  double area = 2 * std::atan2(im, re) + lenses;
  if (area > 2 * kPi) area -= 4 * kPi;
  if (area <= -2 * kPi) area += 4 * kPi;
  return area;
}

double signed_area(const Piece& piece) {
  double sum = 0;
  for (const Loop& loop : piece.loops) sum += loop_area(loop);
  return sum;
}

double area(const Polygon& polygon) {
  double total = 0;
  for (const Piece& piece : polygon.pieces) {
    double sum = signed_area(piece);
    if (sum < -8 * std::numeric_limits<double>::epsilon() * edge_length(piece)) sum += 4 * kPi;
    total += std::max(0.0, sum);
  }
  return total;
}

Vec3 moment(const Piece& piece, const Vec3& origin) {
  Vec3 sum;
  for (const Loop& loop : piece.loops) {
    for (const Arc& arc : loop) {
      const Circle& c = arc.circle;
      sum = sum + cross(arc.from - origin, arc.to - origin) + (c.radius * c.radius * angle_less_sine(arc.dtheta)) * c.n;
    }
  }
  return 0.5 * sum;
}

double perimeter(const Polygon& polygon) {
  double length = 0;
  for (const Piece& piece : polygon.pieces) length += edge_length(piece);
  return length;
}

}  // namespace windrow::sphere
