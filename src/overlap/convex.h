// A cell as a signed sum of parts, each the common part of half-spaces: what a region can be clipped by.
#pragma once
#include <vector>

#include "outline.h"

namespace windrow::overlap {

/// The points of the cell's neighbourhood that lie in every half-space.
struct ConvexPart {
  std::vector<sphere::Circle> sides;
  double sign = 1;
};

struct CellParts {
  /// Of a cell of one loop: the left sides of all its edges. What lies in all of them lies in the cell, convex or not.
  std::vector<sphere::Circle> core;
  bool convex = false;  ///< the core is the cell: nothing has to be taken apart
  std::vector<ConvexPart> parts;
  std::size_t used = 0;  ///< of `parts`, 0 until taken apart; the rest is memory to be used again
};

/// Fills `core` and `convex`.
void find_sides(const sphere::Polygon& polygon, CellParts& out);

/// Fills `parts`. A convex piece of one loop is one part. Any other piece, with holes too, is a fan of great-circle
/// triangles about its first corner (positive or negative as they run) and a lens for each arc that is no great circle:
/// the signs add up to one inside and to nothing outside. Neighbouring parts share their sides to the bit.
void take_apart(const sphere::Polygon& polygon, CellParts& out);

}  // namespace windrow::overlap
