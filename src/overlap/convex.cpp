// Deciding convexity, and taking everything else apart.
#include "convex.h"

#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::overlap {
namespace {

using sphere::Arc;
using sphere::Circle;
using sphere::Loop;
using sphere::Vec3;

// A vertex this far outside a side of its own cell is rounding: several crossings and circles, a few eps each.
constexpr double kRounding = 4 * sphere::kOnCircle;

Circle left_of(const Arc& arc) { return arc.dtheta > 0 ? arc.circle : arc.circle.reversed(); }

// Does an arc that leaves `corner` along `arc` (or ends there) stay on the left of the circle, on its first stretch?
bool turns_left(const Circle& circle, const Vec3& direction) { return dot(circle.n, direction) >= -kRounding; }

Vec3 tangent(const Arc& arc, const Vec3& at) {
  const Vec3 t = unit(cross(arc.circle.n, at));
  return arc.dtheta > 0 ? t : -t;
}

// Corners and middles of all arcs within every side, and no corner over 180 degrees.
bool is_convex(const Loop& loop) {
  const std::size_t n = loop.size();
  for (std::size_t k = 0; k < n; ++k) {
    const Circle side = left_of(loop[k]);
    const double tolerance = kRounding * (side.radius + loop[k].length());
    for (std::size_t m = 0; m < n; ++m) {
      if (m == k) continue;
      if (height(side, loop[m].from) < -tolerance) return false;
      if (loop[m].circle.d != 0 && height(side, point_on(loop[m], 0.5)) < -tolerance) return false;
    }
    const Arc& next = loop[(k + 1) % n];
    if (n > 2 && !turns_left(side, tangent(next, next.from))) return false;
  }
  return true;
}

// Great circle from a to b, the same bits reversed from b to a.
Circle chord_circle(const Vec3& a, const Vec3& b) { return Circle::great(unit(cross(a + b, b - a))); }

class Taker {
 public:
  explicit Taker(CellParts& out) : out_(out) { out_.used = 0; }

  void piece(const sphere::Piece& piece) {
    if (piece.loops.size() == 1 && is_convex(piece.loops.front())) {
      ConvexPart& part = add(1);
      for (const Arc& arc : piece.loops.front()) part.sides.push_back(left_of(arc));
      return;
    }
    const Vec3 apex = piece.loops.front().front().from;
    for (const Loop& loop : piece.loops) {
      for (const Arc& arc : loop) {
        triangle(apex, arc.from, arc.to);
        lens(arc);
      }
    }
  }

 private:
  ConvexPart& add(double sign) {
    if (out_.used == out_.parts.size()) out_.parts.emplace_back();
    ConvexPart& part = out_.parts[out_.used++];
    part.sides.clear();
    part.sign = sign;
    return part;
  }

  void triangle(const Vec3& a, const Vec3& b, const Vec3& c) {
    if (norm(b - a) <= sphere::kOnCircle || norm(c - a) <= sphere::kOnCircle || norm(c - b) <= sphere::kOnCircle)
      return;
    const double turn = dot(a, cross(b - a, c - a));
    if (turn == 0) return;
    ConvexPart& part = add(turn > 0 ? 1 : -1);
    for (const auto& [from, to] : {std::pair(a, b), std::pair(b, c), std::pair(c, a)}) {
      const Circle side = chord_circle(from, to);
      part.sides.push_back(turn > 0 ? side : side.reversed());
    }
  }

  // Between an arc and its chord; outside the chord it adds, inside it takes away.
  void lens(const Arc& arc) {
    if (arc.circle.d == 0) return;
    const Circle chord = chord_circle(arc.from, arc.to);
    const Circle left = left_of(arc);
    const bool outward = left.d > 0;
    ConvexPart& part = add(outward ? 1 : -1);
    part.sides.push_back(outward ? left : left.reversed());
    part.sides.push_back(outward ? chord.reversed() : chord);
  }

  CellParts& out_;
};

}  // namespace

void find_sides(const sphere::Polygon& polygon, CellParts& out) {
  out.core.clear();
  out.used = 0;
  out.convex = false;
  if (polygon.pieces.size() != 1 || polygon.pieces.front().loops.size() != 1) return;
  const Loop& loop = polygon.pieces.front().loops.front();
  for (const Arc& arc : loop) out.core.push_back(left_of(arc));
  out.convex = is_convex(loop);
}

void take_apart(const sphere::Polygon& polygon, CellParts& out) {
  Taker taker(out);
  for (const sphere::Piece& piece : polygon.pieces) taker.piece(piece);
}

}  // namespace windrow::overlap
