// What the dimensions of one variable are, and which grid mapping goes with it. Names decide only as a last resort.
#pragma once
#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "inputs.h"
#include "roles.h"

namespace windrow::cf {

/// The grid mapping of a variable, as far as it decides what its axes mean.
struct Mapping {
  enum class Kind { none, latlon, rotated, healpix, projected };
  Kind kind = Kind::none;
  std::string name;                   ///< grid_mapping_name, "crs_wkt" where that alone says it
  const nc::Var* variable = nullptr;  ///< null without a mapping
};

struct Axis {
  const nc::Dim* dim = nullptr;
  Role role = Role::unknown;
  const nc::Var* values = nullptr;  ///< one-dimensional coordinate; null when there is none
};

/// All that recognising a grid looks at.
struct Context {
  const Inputs& inputs;
  const nc::Var& variable;
  const GridHints& hints;
  Remarks& remarks;
  Mapping mapping;
  std::vector<Axis> axes;  ///< one a dimension of the variable, slowest first

  [[nodiscard]] const Header& header() const { return inputs.header(); }
  [[nodiscard]] const Axis* axis(Role role) const;  ///< the one of that role; Error(data) when two long ones look so
  [[noreturn]] void fail(const std::string& text) const;
};

/// Latitudes and longitudes over the same dimensions.
struct LatLonPair {
  const nc::Var* latitude = nullptr;
  const nc::Var* longitude = nullptr;
  std::vector<int> dims;  ///< ids, in the variable's order
};

/// A named mapping that is not in the file is said and counts as none.
Mapping mapping_of(const Header& header, const nc::Var& variable, Remarks& remarks);

/// Recognises by units, standard_name, axis, then (said in `remarks`) by name; the coordinate may be the dimension's
/// own variable or any one-dimensional variable over it. Rotated and projected axes are looked for as the mapping says.
std::vector<Axis> axes_of(const Inputs& inputs, const nc::Var& variable, const std::vector<int>& dims,
                          const Mapping& mapping, const GridHints& hints, Remarks& remarks);

/// The pair over `rank` of the context's dimensions (time and height never count, and other dimensions must have length
/// 1). Those that the variable's `coordinates` names come first; Error(data) when several others fit.
std::optional<LatLonPair> latlon_pair(const Context& context, std::size_t rank);

/// Where time stands among the variable's dimensions, and that all that is neither time nor in `horizontal` has
/// length 1. A time dimension of length 1 without decodable units is dropped and said.
struct TimeAxis {
  std::ptrdiff_t position = -1;
  const nc::Var* values = nullptr;  ///< null exactly when position is -1
};
TimeAxis time_axis_of(const Context& context, const std::vector<int>& horizontal);

}  // namespace windrow::cf
