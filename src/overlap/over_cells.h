// Overlaps of any mesh with any other, by clipping the cells of one with the parts of the other's.
#pragma once
#include <functional>

#include "pairings.h"
#include "windrow/mesh/index.h"

namespace windrow::overlap {

/// Makes what finds overlaps of cells [first, last) of `cells` (rows) with those of `clip` (columns); one a thread, it
/// keeps cells it has taken apart from run to run, which no result depends on. `index` is clip's.
std::function<Rows(std::size_t first, std::size_t last)> over_cells(const mesh::Mesh& clip, const mesh::Index& index,
                                                                    const mesh::Mesh& cells, const MomentFrame& frame);

}  // namespace windrow::overlap
