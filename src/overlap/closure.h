// Do the overlaps add up to the cells they are parts of? Looked at before anything is normalised.
#pragma once
#include <vector>

#include "pairings.h"
#include "windrow/overlap/overlap.h"

namespace windrow::overlap {

/// Compares sums over rows and columns with the cells' own areas. `blocks` hold the target's cells in order.
/// A column counts as fully inside the target when no cell on the target's rim overlaps it.
/// Error(defect) when a residual exceeds its bound tenfold.
Closure check_closure(const std::vector<Rows>& blocks, const mesh::Mesh& source, const mesh::Mesh& target);

}  // namespace windrow::overlap
