// Neighbourhoods of cells, also those by sides only that smoothing needs.
#pragma once
#include "windrow/overlap/methods.h"

namespace windrow::overlap {

/// Cells that share a side, where rows and columns tell; all that touch otherwise. Compressed rows as in `neighbours`.
Neighbours side_neighbours(const mesh::Mesh& mesh);

/// Turns pairs (lower number first, any order, none twice) into compressed rows over `cells` cells.
Neighbours from_pairs(std::size_t cells, const std::vector<std::pair<std::uint32_t, std::uint32_t>>& pairs);

}  // namespace windrow::overlap
