// Overlaps of any mesh with any other, by clipping the cells of one with the parts of the other's.
#pragma once
#include "pairings.h"
#include "windrow/mesh/index.h"

namespace windrow::overlap {

/// Overlaps of cells [first, last) of `cells` (rows) with those of `clip` (columns). `index` is clip's. Pure:
/// neighbouring runs may be worked on at the same time.
Rows over_cells(const mesh::Mesh& clip, const mesh::Index& index, const mesh::Mesh& cells, const MomentFrame& frame,
                std::size_t first, std::size_t last);

}  // namespace windrow::overlap
