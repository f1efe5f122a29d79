// Which dimension of a variable is latitude, longitude, time: decided from CF metadata, names only as a last resort.
#pragma once
#include <cstddef>

#include "header.h"

namespace windrow::cf {

/// Dimensions of one variable in one file. Positions count in the variable's dimension list, slowest first.
struct Layout {
  std::size_t latitude = 0, longitude = 0;
  std::ptrdiff_t time = -1;  ///< -1: no time dimension
  const nc::Var* latitude_values = nullptr;
  const nc::Var* longitude_values = nullptr;
  const nc::Var* time_values = nullptr;  ///< null exactly when time is -1
  std::vector<std::size_t> lengths;      ///< of all dimensions; those not named above are 1
};

/// Recognises by units, standard_name, axis, then (said in `remarks`) by name; the coordinate may be the dimension's
/// own variable or any 1-D variable over it. Error(data) for anything but a latitude-longitude grid: two-dimensional
/// coordinates, projected or rotated axes, stations, several levels, an extra dimension, no axes at all.
/// A time dimension of length 1 without decodable units is dropped and said.
Layout recognise(const Header& header, const nc::Var& variable, Remarks& remarks);

/// True for variables that describe others: coordinates, bounds, grid mappings, cell measures.
bool is_auxiliary(const Header& header, const nc::Var& variable);

}  // namespace windrow::cf
