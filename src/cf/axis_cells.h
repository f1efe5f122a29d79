// From the values and bounds of one axis to cells with shared, ascending edges. Pure: no file.
#pragma once
#include <cstddef>
#include <string>
#include <vector>

#include "header.h"

namespace windrow::cf {

/// A coordinate axis as the file has it, in degrees (of plain axes: in `unit`).
struct AxisValues {
  std::string place;  ///< file, for errors
  std::string name;   ///< of the coordinate variable
  std::vector<double> centres;
  std::vector<double> bounds;  ///< 2 a centre, or empty
  std::string bounds_name;
  bool single_precision = false;  ///< stored as float
  std::string unit = "degrees";   ///< for what is said
};

/// Cells in ascending order: cell k lies between edges[k] and edges[k + 1], and is array position index[k].
struct AxisCells {
  std::vector<double> edges;
  std::vector<std::size_t> index;
  std::vector<double> centres;  ///< ascending, cleaned of float rounding
  double step = 0;              ///< spacing when regular, else 0
  bool from_bounds = false;
};

/// Latitude: strictly monotonic either way, edges within -90..90 (cells centred at a pole are half cells).
/// Longitude: may jump by a full turn once inside the array; repeated columns are dropped; a span that reaches 360
/// within rounding is made exactly 360; gaps are errors.
/// Values that are regular within the rounding of their type (4 ulp of float32, or 1e-9 degrees) get correctly rounded
/// regular edges. Error(data) for a single value without bounds, non-monotonic values, bounds with gaps or overlaps or
/// that do not hold their centres.
AxisCells latitude_cells(AxisValues values, Remarks& remarks);
AxisCells longitude_cells(AxisValues values, Remarks& remarks);
/// An axis of a plane: neither poles nor turns.
AxisCells plane_cells(AxisValues values, Remarks& remarks);

/// Undoes float32 rounding (the shortest decimal that gives the same float), when all values are floats; returns the
/// tolerance within which values count as regular: 4 ulp of float32, or 1e-9.
double clean_rounding(std::vector<double>& values, bool single_precision);

}  // namespace windrow::cf
