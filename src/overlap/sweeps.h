// Sweeps of neighbour means over a mesh, as weights of source cells. Restoring integrals is elsewhere.
#pragma once
#include <cstdint>
#include <vector>

#include "windrow/linear_map/linear_map.h"
#include "windrow/mesh/mesh.h"

namespace windrow::overlap {

/// Smoothed shares in compressed rows, columns ascending; a row sums to 1, a row without cover has none.
struct SmoothShares {
  std::size_t sweeps = 0;
  std::vector<std::uint64_t> start;
  std::vector<std::uint32_t> column;
  std::vector<double> share;
};

/// Sweeps (each the mean of a covered mesh cell and its covered neighbours) over the shares of `map` (first-order
/// conservative, normalised by row), so many that a step between source cells becomes about as wide as they are; none
/// where they are smaller than the mesh's. Weights below 1e-4 are left out, except of source cells that overlap the
/// mesh cell.
SmoothShares smoothed_shares(const linear_map::LinearMap& map, const mesh::Mesh& target);

}  // namespace windrow::overlap
