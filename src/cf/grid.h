// The horizontal grid of one variable in one file, with the way from mesh cells to array positions.
#pragma once
#include <cstddef>
#include <vector>

#include "axes.h"
#include "header.h"
#include "windrow/cf/dataset.h"

namespace windrow::cf {

struct FileGrid {
  Grid grid;
  std::vector<std::size_t> latitude_index, longitude_index;  ///< array position of mesh row, of mesh column
};

/// Reads coordinates and bounds and makes cells of them; see axis_cells.h for what is repaired and what is an error.
/// Gaussian latitudes without bounds (the whole globe, or a window of at least 4 rows) get the edges that belong to the
/// quadrature weights.
FileGrid read_grid(const nc::File& file, const Header& header, const Layout& layout, Remarks& remarks);

}  // namespace windrow::cf
