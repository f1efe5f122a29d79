// Where a region is with respect to a half-space, told from its corners alone.
#pragma once
#include <vector>

#include "windrow/sphere/polygon.h"

namespace windrow::overlap {

/// Points and a margin: a region's boundary is within `margin` of the convex hull of the points.
struct Outline {
  std::vector<sphere::Vec3> points;
  double margin = 0;
};
void outline_of(const sphere::Piece& piece, Outline& out);

/// Where an outline is with respect to a half-space; `across` also when the margin leaves it open.
enum class Side { inside, outside, across };
Side side_of(const sphere::Circle& half_space, const Outline& outline);

/// The same for the region within the outline: `across` also when it is so large that it may lie around the circle, as
/// a cell around a pole lies around parallels that its boundary does not come near.
Side side_of_region(const sphere::Circle& half_space, const Outline& outline);

}  // namespace windrow::overlap
