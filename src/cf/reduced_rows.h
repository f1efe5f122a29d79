// Cells of a reduced grid from its points alone: rows of one latitude, longitudes spaced within each. Pure: no file.
#pragma once
#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "windrow/mesh/cell_records.h"

namespace windrow::cf {

struct ReducedRows {
  mesh::CellCorners corners;  ///< of the points in their order; sides run along parallels and meridians
  std::size_t rows = 0;
  std::size_t gaussian = 0;  ///< latitudes of the whole Gaussian grid these are rows of; 0: none
};

/// Nothing when the points are no such rows: a missing coordinate, latitudes that come back after another, a row of one
/// point, or longitudes that make no row (see axis_cells.h). `place` is for errors only.
std::optional<ReducedRows> reduced_rows(const std::vector<double>& lon_deg, const std::vector<double>& lat_deg,
                                        const std::string& place);

}  // namespace windrow::cf
