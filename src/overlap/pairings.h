// Overlap areas before they become shares: what the two ways of finding them hand over.
#pragma once
#include <cstdint>
#include <limits>
#include <vector>

namespace windrow::overlap {

/// Overlap of one target cell with one source cell, steradians.
struct Pairing {
  std::uint32_t column;
  double area;
};

/// Overlaps of a run of target cells, columns ascending within a row.
struct Rows {
  std::vector<std::uint32_t> count;  ///< pairings of each row
  std::vector<Pairing> pairings;
  std::vector<std::uint8_t> covered;  ///< row lies wholly within the source's extent: its sum is checked
  std::vector<double> bound;          ///< closure bound of each row, relative
};

/// Closure bound of a cell, relative to its area: 1e-12 for the sums, 8 eps * perimeter for edges and their rounding.
inline double closure_bound(double perimeter, double area) {
  return 1e-12 + 8 * std::numeric_limits<double>::epsilon() * perimeter / area;
}

/// Overlaps below this times the cell's perimeter (rad) are rounding of an edge that two cells share, not cells that
/// overlap. Eight of them fit in the closure bound.
inline constexpr double kSliver = std::numeric_limits<double>::epsilon();

}  // namespace windrow::overlap
