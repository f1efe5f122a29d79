// Overlaps of any mesh with a latitude-longitude source, by clipping where it cannot be avoided.
#pragma once
#include "pairings.h"
#include "source_block.h"

namespace windrow::overlap {

/// Overlaps of cells [first, last) of `cells` (rows) with those of `block` (columns). Pure: neighbouring runs may be
/// worked on at the same time.
Rows over_latlon(const SourceBlock& block, const mesh::Mesh& cells, const MomentFrame& frame, std::size_t first,
                 std::size_t last);

}  // namespace windrow::overlap
