// Overlaps of two meshes, whichever way round they are found soonest.
#pragma once
#include <vector>

#include "pairings.h"

namespace windrow::overlap {

/// Rows of the target's cells in order. With `centroids` (of the source) moments come too. Error(data) when a mesh has
/// no area or more than 2^32 cells.
std::vector<Rows> overlaps(const mesh::Mesh& source, const mesh::Mesh& target, const Centroids* centroids);

}  // namespace windrow::overlap
