// Cells read one by one: their corners, what cannot be used of them, which of them repeat others. Shared by curvilinear
// grids and listed cells.
#pragma once
#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "grid.h"

namespace windrow::cf {

/// Latitudes or longitudes of cells over `dims`, in degrees, NaN where missing. Error(data) for what is no place.
std::vector<double> read_degrees(const Context& context, const nc::Var& coordinate, const std::vector<int>& dims);

/// Corners from the bounds of both coordinates: cells x vertices, trailing missing ones beyond a cell's own corners;
/// or, for cells along one dimension, two ends of each (a rectangle). Nothing (said, when there is something to say)
/// without usable bounds. Error(data) when a missing corner stands before others, or the two disagree on how many there
/// are.
std::optional<mesh::CellCorners> read_corners(const Context& context, const LatLonPair& pair,
                                              const std::vector<int>& dims);
/// How far the same corner may differ between cells of this file.
double rounding_of(const std::vector<double>& degrees, nc_type type);

/// Leaves out cells without coordinates, cells without area, and cells that repeat an earlier one's centre and corners
/// (centre alone where corners were only `inferred`); each is said once with the number. The cells keep the shape ny x
/// nx when nothing, or whole rows and columns, went. Returns where the cells stand in the array. Error(data) when none
/// remains.
Places keep_usable(const Context& context, mesh::CellCorners& corners, std::size_t ny, std::size_t nx,
                   bool inferred = false);

/// Sides::parallels when `natural`, unless the job says otherwise. Error(data) for another word.
mesh::Sides sides_of(const Context& context, bool parallels);
std::string sides_text(const Context& context, mesh::Sides sides);

}  // namespace windrow::cf
