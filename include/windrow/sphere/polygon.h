// Regions of the unit sphere bounded by circle arcs. Area and clipping live in area.h and clip.h.
#pragma once
#include <vector>

#include "windrow/sphere/circle.h"

namespace windrow::sphere {

/// A closed chain of arcs; the region lies on its left. No arc has zero length.
using Loop = std::vector<Arc>;

/// One connected region: an outer loop and any number of holes (holes run clockwise, so that the region is on the
/// left).
struct Piece {
  std::vector<Loop> loops;
};

/// A cell: one or more pieces that touch at most along edges. A latitude-longitude cell wider than 90 degrees, or
/// reaching over the equator by more than 90 degrees, comes in several pieces, so that every piece fits in an octant.
struct Polygon {
  std::vector<Piece> pieces;
};

}  // namespace windrow::sphere
