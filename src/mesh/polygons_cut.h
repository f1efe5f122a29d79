// Cutting regions that are too wide for one piece along the planes of the axes. Nothing of maps or cells is known here.
#pragma once
#include <vector>

#include "windrow/sphere/polygon.h"

namespace windrow::mesh::polygons {

/// Does the region need several pieces? Those of less than 45 degrees about their middle do not.
bool too_wide(const sphere::Piece& region);

/// Points where the arc passes through a plane of two axes, in its own direction; ends are none.
std::vector<sphere::Vec3> axis_crossings(const sphere::Arc& arc);

/// The parts of a region of at most half the globe in the eight octants, those without area left out. Arcs that were
/// parted at axis_crossings() keep their bits; those along the cuts are great circles.
std::vector<sphere::Piece> octants(const sphere::Piece& region);

}  // namespace windrow::mesh::polygons
