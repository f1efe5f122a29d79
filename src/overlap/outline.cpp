// Outlines and half-spaces.
#include "outline.h"

#include <algorithm>

namespace windrow::overlap {

using sphere::Vec3;

void outline_of(const sphere::Piece& piece, Outline& out) {
  out.points.clear();
  out.margin = 0;
  for (const sphere::Loop& loop : piece.loops) {
    for (const sphere::Arc& arc : loop) {
      out.points.push_back(arc.from);
      out.margin = std::max(out.margin, arc.circle.radius * arc.dtheta * arc.dtheta / 8);  // >= its sagitta
    }
  }
}

Side side_of(const sphere::Circle& half_space, const Outline& outline) {
  double lowest = 4;
  double highest = -4;
  for (const Vec3& p : outline.points) {
    const double h = sphere::height(half_space, p);
    lowest = std::min(lowest, h);
    highest = std::max(highest, h);
  }
  if (lowest >= outline.margin) return Side::inside;
  if (highest <= -outline.margin) return Side::outside;
  return Side::across;
}

Side side_of_region(const sphere::Circle& half_space, const Outline& outline) {
  const Side side = side_of(half_space, outline);
  // Only what lies around the smaller of both sides can hold the circle unseen, and it is wider than the circle.
  if (side == Side::across || (side == Side::inside ? half_space.d >= 0 : half_space.d <= 0)) return side;
  for (const Vec3& p : outline.points) {
    if (norm(p - outline.points.front()) + outline.margin >= half_space.radius) return Side::across;
  }
  return side;
}

}  // namespace windrow::overlap
