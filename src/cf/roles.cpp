// Roles of coordinate variables from units, standard_name and axis. CF 1.13: units decide for latitude, longitude and
// time; standard_name for the axes of rotated and projected grids.
#include "roles.h"

#include <algorithm>
#include <initializer_list>

namespace windrow::cf {

namespace {

bool one_of(const std::string& word, std::initializer_list<const char*> list) {
  return std::ranges::any_of(list, [&](const char* candidate) { return word == candidate; });
}

/// Names in attributes that list variables, with or without "key:" before them.
bool lists(const std::string& text, const std::string& name) {
  for (std::string word : words(text)) {
    if (word.ends_with(':')) word.pop_back();
    if (word == name) return true;
  }
  return false;
}

}  // namespace

bool is_radian(const std::string& units) { return one_of(lower(units), {"radian", "radians", "rad"}); }

bool is_number(const nc::Var& variable) { return nc::type_size(variable.type) > 0 && variable.type != NC_CHAR; }

std::string plain_axis_units(const std::string& units) {
  const std::string word = lower(units);
  if (one_of(word, {"m", "metre", "metres", "meter", "meters"})) return "m";
  if (one_of(word, {"km", "kilometre", "kilometres", "kilometer", "kilometers"})) return "km";
  return is_radian(word) ? "radian" : "";
}

Role role_of(const nc::Var& variable) {
  const std::string standard_name = lower(variable.text("standard_name"));
  const std::string units = lower(variable.text("units"));
  const std::string axis = lower(variable.text("axis"));
  if (standard_name == "grid_latitude") return Role::grid_latitude;
  if (standard_name == "grid_longitude") return Role::grid_longitude;
  if (one_of(standard_name, {"projection_x_coordinate", "projection_x_angular_coordinate"})) return Role::x;
  if (one_of(standard_name, {"projection_y_coordinate", "projection_y_angular_coordinate"})) return Role::y;
  if (one_of(units, {"degrees_north", "degree_north", "degree_n", "degrees_n", "degreen", "degreesn"}))
    return Role::latitude;
  if (one_of(units, {"degrees_east", "degree_east", "degree_e", "degrees_e", "degreee", "degreese"}))
    return Role::longitude;
  if (standard_name == "latitude") return Role::latitude;
  if (standard_name == "longitude") return Role::longitude;
  if (units.find(" since ") != std::string::npos || standard_name == "time" || axis == "t") return Role::time;
  if (axis == "z" || !variable.text("positive").empty() ||
      one_of(units, {"pa", "hpa", "mb", "mbar", "millibar", "millibars", "level", "layer", "sigma_level"}))
    return Role::vertical;
  if ((axis == "x" || axis == "y") && !plain_axis_units(units).empty()) return axis == "x" ? Role::x : Role::y;
  return Role::unknown;
}

Role role_by_name(const std::string& name) {
  const std::string word = lower(name);
  if (one_of(word, {"lat", "latitude", "lats"})) return Role::latitude;
  if (one_of(word, {"lon", "long", "longitude", "lons"})) return Role::longitude;
  if (one_of(word, {"rlat", "grid_latitude"})) return Role::grid_latitude;
  if (one_of(word, {"rlon", "grid_longitude"})) return Role::grid_longitude;
  if (one_of(word, {"x", "xc", "easting", "eastings"})) return Role::x;
  if (one_of(word, {"y", "yc", "northing", "northings"})) return Role::y;
  if (one_of(word, {"time", "t"})) return Role::time;
  if (one_of(word, {"lev", "level", "plev", "height", "depth", "alt", "altitude"})) return Role::vertical;
  return Role::unknown;
}

const char* role_text(Role role) {
  switch (role) {
    case Role::latitude:
      return "latitude";
    case Role::longitude:
      return "longitude";
    case Role::grid_latitude:
      return "rotated latitude";
    case Role::grid_longitude:
      return "rotated longitude";
    case Role::x:
      return "the projection's x axis";
    case Role::y:
      return "the projection's y axis";
    case Role::time:
      return "time";
    case Role::vertical:
      return "height";
    case Role::unknown:
      break;
  }
  return "nothing known";
}

bool is_auxiliary(const Header& header, const nc::Var& variable) {
  if (!is_number(variable) || !variable.text("grid_mapping_name").empty() || !variable.text("cf_role").empty())
    return true;
  if (!variable.text("crs_wkt").empty() || !variable.text("compress").empty()) return true;
  if (variable.dims.empty()) {
    // A number without dimensions is data only when it says what it measures and what its coordinates are.
    if (variable.text("coordinates").empty() || role_of(variable) != Role::unknown) return true;
  }
  if (variable.dims.size() == 1 && header.dim(variable.dims[0]).name == variable.name) return true;
  switch (role_of(variable)) {
    case Role::latitude:
    case Role::longitude:
    case Role::grid_latitude:
    case Role::grid_longitude:
    case Role::x:
    case Role::y:
      return true;
    default:
      break;
  }
  if (lower(variable.text("standard_name")) == "healpix_index") return true;
  for (const nc::Var& other : header.vars)
    for (const char* name : {"bounds", "climatology", "coordinates", "grid_mapping", "cell_measures", "formula_terms",
                             "edges", "node_coordinates", "face_coordinates", "edge_coordinates",
                             "face_node_connectivity", "edge_node_connectivity", "face_edge_connectivity",
                             "face_face_connectivity", "edge_face_connectivity", "boundary_node_connectivity"})
      if (lists(other.text(name), variable.name)) return true;
  return false;
}

}  // namespace windrow::cf
