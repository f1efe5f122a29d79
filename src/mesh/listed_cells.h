// Cells listed corner by corner become cells with shared edges: corners that are the same become one, loops are put in
// order, sides are laid. For make_cells and make_faces; reading records is theirs.
#pragma once
#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <vector>

#include "edged_mesh.h"

namespace windrow::mesh {

/// Loops over points; a point may stand in many loops, and many points may be the same place.
struct ListedCells {
  std::vector<sphere::Vec3> point;
  std::vector<double> lat_deg;        ///< one a point, as listed: sides between equal ones may be parallels
  std::vector<std::uint32_t> corner;  ///< numbers of points, cell by cell
  std::vector<std::uint64_t> cell_start{0};
  double rounding_deg = 1e-9;
  Sides sides = Sides::great_circles;
  std::function<std::string(std::size_t)> name;  ///< of a cell, for errors

  [[nodiscard]] std::size_t cells() const { return cell_start.size() - 1; }
  [[nodiscard]] std::span<const std::uint32_t> corners(std::size_t cell) const {
    return {corner.data() + cell_start[cell], corner.data() + cell_start[cell + 1]};
  }
};

/// For every point the number of the earlier point that is the same place, or its own: the nearest within a hundredth
/// of the shortest side there, and at most the rounding.
std::vector<std::uint32_t> merge_points(const ListedCells& listed);

/// Edges and loops of all cells. Nodes are numbered as cells first use them. Error(data) as make_cells says; clockwise
/// loops are turned and noted once.
EdgedCells lay_edges(const ListedCells& listed, const std::string& place, Notices& notices);

}  // namespace windrow::mesh
