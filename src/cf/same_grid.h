// Do two files of a run stand on one grid, within the rounding of their coordinates?
#pragma once
#include <string>

#include "windrow/cf/dataset.h"

namespace windrow::cf {

/// Empty when they do; else what differs, as a clause: "the grid is another (HOW against HOW)". Coordinates may differ
/// by 1e-4 of a cell, corners by the rounding of the files; longitudes by full turns.
std::string grid_difference(const Grid& first, const Grid& other);

}  // namespace windrow::cf
