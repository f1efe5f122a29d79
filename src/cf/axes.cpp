// Recognising axes. CF 1.13 sections 4.1-4.4 (units decide for latitude, longitude and time), 5.6 (grid mappings).
#include "axes.h"

#include <fmt/format.h>

#include <algorithm>
#include <initializer_list>
#include <optional>

namespace windrow::cf {

namespace {

enum class Role { unknown, latitude, longitude, time, vertical, projected };

bool one_of(const std::string& word, std::initializer_list<const char*> list) {
  return std::ranges::any_of(list, [&](const char* candidate) { return word == candidate; });
}

/// The role that the metadata gives a coordinate variable; names play no part.
Role role_of(const nc::Var& var) {
  const std::string standard_name = lower(var.text("standard_name"));
  const std::string units = lower(var.text("units"));
  const std::string axis = lower(var.text("axis"));
  if (one_of(standard_name, {"grid_latitude", "grid_longitude", "projection_x_coordinate", "projection_y_coordinate",
                             "projection_x_angular_coordinate", "projection_y_angular_coordinate"}))
    return Role::projected;
  if (one_of(units, {"degrees_north", "degree_north", "degree_n", "degrees_n", "degreen", "degreesn"}))
    return Role::latitude;
  if (one_of(units, {"degrees_east", "degree_east", "degree_e", "degrees_e", "degreee", "degreese"}))
    return Role::longitude;
  if (standard_name == "latitude") return Role::latitude;
  if (standard_name == "longitude") return Role::longitude;
  if (units.find(" since ") != std::string::npos || standard_name == "time" || axis == "t") return Role::time;
  if (axis == "z" || !var.text("positive").empty() ||
      one_of(units, {"pa", "hpa", "mb", "mbar", "millibar", "millibars", "level", "layer", "sigma_level"}))
    return Role::vertical;
  if ((axis == "x" || axis == "y") && one_of(units, {"m", "km", "metre", "metres", "meter", "meters", "kilometer"}))
    return Role::projected;
  return Role::unknown;
}

Role role_by_name(const std::string& name) {
  const std::string word = lower(name);
  if (one_of(word, {"lat", "latitude", "lats"})) return Role::latitude;
  if (one_of(word, {"lon", "long", "longitude", "lons"})) return Role::longitude;
  if (one_of(word, {"time", "t"})) return Role::time;
  if (one_of(word, {"lev", "level", "plev", "height", "depth", "alt", "altitude"})) return Role::vertical;
  return Role::unknown;
}

bool is_number(const nc::Var& var) { return nc::type_size(var.type) > 0 && var.type != NC_CHAR; }

struct Axis {
  Role role = Role::unknown;
  const nc::Var* values = nullptr;
};

class Recogniser {
 public:
  Recogniser(const Header& header, const nc::Var& variable, Remarks& remarks)
      : header_(header), variable_(variable), remarks_(remarks) {}

  Layout layout() {
    refuse_unless_latlon_mapping();
    Layout layout;
    std::vector<Axis> axes;
    for (const int id : variable_.dims) {
      axes.push_back(axis_of(header_.dim(id)));
      layout.lengths.push_back(header_.dim(id).length);
    }
    const auto lat = position(axes, Role::latitude), lon = position(axes, Role::longitude);
    const auto time = position(axes, Role::time);
    if (!lat || !lon) refuse_without_latlon(axes);
    layout.latitude = *lat;
    layout.longitude = *lon;
    layout.latitude_values = axes[*lat].values;
    layout.longitude_values = axes[*lon].values;
    if (time) place_time(layout, *time, axes[*time].values);
    for (std::size_t i = 0; i < axes.size(); ++i) {
      if (i == *lat || i == *lon || std::ptrdiff_t(i) == layout.time || layout.lengths[i] == 1) continue;
      refuse_dimension(header_.dim(variable_.dims[i]), axes[i]);
    }
    for (const std::size_t i : {*lat, *lon})
      if (layout.lengths[i] == 0) fail(fmt::format("dimension '{}' is empty", header_.dim(variable_.dims[i]).name));
    return layout;
  }

 private:
  [[noreturn]] void fail(const std::string& text) const {
    throw Error(Failure::data, header_.path, fmt::format("variable '{}': {}", variable_.name, text));
  }

  /// Numeric 1-D variables over the dimension: its own coordinate variable first, then those the variable's
  /// `coordinates` attribute names, then the others.
  std::vector<const nc::Var*> candidates(const nc::Dim& dim) const {
    const std::vector<std::string> listed = words(variable_.text("coordinates"));
    const auto rank = [&](const nc::Var& var) {
      return var.name == dim.name ? 0 : std::ranges::find(listed, var.name) != listed.end() ? 1 : 2;
    };
    std::vector<const nc::Var*> found;
    for (const nc::Var& var : header_.vars)
      if (&var != &variable_ && var.dims.size() == 1 && var.dims[0] == dim.id && is_number(var)) found.push_back(&var);
    std::ranges::stable_sort(found, {}, [&](const nc::Var* var) { return rank(*var); });
    return found;
  }

  Axis axis_of(const nc::Dim& dim) {
    const std::vector<const nc::Var*> found = candidates(dim);
    if (!found.empty() && found[0]->name == dim.name) {
      const Role role = role_of(*found[0]);
      if (role != Role::unknown) return {role, found[0]};
    }
    Axis auxiliary;
    for (const nc::Var* var : found) {
      const Role role = role_of(*var);
      if (role != Role::latitude && role != Role::longitude && role != Role::time) continue;
      if (auxiliary.values != nullptr && auxiliary.role != role && role != Role::time && auxiliary.role != Role::time)
        fail(fmt::format("'{}' and '{}' share the dimension '{}': these are stations or a track, not a grid",
                         auxiliary.values->name, var->name, dim.name));
      if (auxiliary.values == nullptr) auxiliary = {role, var};
    }
    if (auxiliary.values != nullptr) return auxiliary;
    for (const nc::Var* var : found) {
      const Role role = role_by_name(var->name);
      if (role == Role::unknown) continue;
      if (role != Role::vertical)
        remarks_.push_back(
            fmt::format("'{}' is taken for {} by its name alone: it has no units, standard_name or axis "
                        "that says so",
                        var->name, role_text(role)));
      return {role, var};
    }
    if (found.empty() && dim.length > 1 && role_by_name(dim.name) != Role::unknown &&
        role_by_name(dim.name) != Role::vertical)
      fail(fmt::format("dimension '{}' has no coordinate variable, so its values are not known", dim.name));
    return {Role::unknown, found.empty() ? nullptr : found[0]};
  }

  static const char* role_text(Role role) {
    return role == Role::latitude ? "latitude" : role == Role::longitude ? "longitude" : "time";
  }

  std::optional<std::size_t> position(const std::vector<Axis>& axes, Role role) const {
    std::optional<std::size_t> found;
    for (std::size_t i = 0; i < axes.size(); ++i) {
      if (axes[i].role != role || axes[i].values == nullptr) continue;
      if (found && header_.dim(variable_.dims[i]).length == 1) continue;  // e.g. a forecast reference time beside time
      if (found && header_.dim(variable_.dims[*found]).length > 1)
        fail(fmt::format("both '{}' and '{}' look like {}", axes[*found].values->name, axes[i].values->name,
                         role_text(role)));
      found = i;
    }
    return found;
  }

  void place_time(Layout& layout, std::size_t position, const nc::Var* values) {
    const std::string units = values->text("units");
    const bool decodable = lower(units).find(" since ") != std::string::npos || units.find('@') != std::string::npos ||
                           lower(units).find(" after ") != std::string::npos ||
                           lower(units).find(" from ") != std::string::npos ||
                           lower(units).find(" ref ") != std::string::npos;
    if (!decodable && layout.lengths[position] == 1) {
      remarks_.push_back(
          fmt::format("the single time step of '{}' has the units '{}', which name no date: '{}' is read "
                      "as a fixed field",
                      values->name, units, variable_.name));
      return;
    }
    if (!decodable)
      fail(fmt::format("time axis '{}' has the units '{}', which name no date; expected '<unit> since <date>'",
                       values->name, units));
    layout.time = std::ptrdiff_t(position);
    layout.time_values = values;
  }

  void refuse_unless_latlon_mapping() const {
    const std::vector<std::string> mapping_words = words(variable_.text("grid_mapping"));
    if (mapping_words.empty()) return;
    std::string name = mapping_words[0];
    if (name.ends_with(':')) name.pop_back();
    const nc::Var* mapping = header_.find(name);
    const std::string kind = mapping != nullptr ? mapping->text("grid_mapping_name") : std::string();
    if (!kind.empty() && lower(kind) != "latitude_longitude")
      fail(fmt::format("on a {} grid (grid mapping '{}', dimensions {}); only latitude-longitude grids can be read",
                       kind, name, header_.shape_text(variable_)));
  }

  [[noreturn]] void refuse_without_latlon(const std::vector<Axis>& axes) const {
    for (const nc::Var& var : header_.vars) {
      const Role role = role_of(var);
      if (var.dims.size() == 2 && (role == Role::latitude || role == Role::longitude))
        fail(
            fmt::format("latitude and longitude are two-dimensional ({}{}); only latitude-longitude grids with "
                        "one-dimensional axes can be read",
                        var.name, header_.shape_text(var)));
    }
    for (const Axis& axis : axes)
      if (axis.role == Role::projected)
        fail(fmt::format("projected or rotated axis '{}' ({}); only latitude-longitude grids can be read",
                         axis.values->name, axis.values->text("standard_name")));
    fail(
        fmt::format("no latitude-longitude axes among its dimensions {}; expected one-dimensional coordinates with the "
                    "units degrees_north and degrees_east",
                    header_.shape_text(variable_)));
  }

  [[noreturn]] void refuse_dimension(const nc::Dim& dim, const Axis& axis) const {
    if (axis.role == Role::vertical)
      fail(fmt::format("{} levels along '{}'{}; a field with a single level is needed", dim.length, dim.name,
                       axis.values != nullptr && !axis.values->text("units").empty()
                           ? " (" + axis.values->text("units") + ")"
                           : std::string()));
    fail(fmt::format("further dimension '{}' of length {}; only dimensions of length 1 can be dropped", dim.name,
                     dim.length));
  }

  const Header& header_;
  const nc::Var& variable_;
  Remarks& remarks_;
};

}  // namespace

Layout recognise(const Header& header, const nc::Var& variable, Remarks& remarks) {
  return Recogniser(header, variable, remarks).layout();
}

bool is_auxiliary(const Header& header, const nc::Var& variable) {
  if (!is_number(variable) || !variable.text("grid_mapping_name").empty() || !variable.text("cf_role").empty())
    return true;
  if (variable.dims.empty()) return true;
  if (variable.dims.size() == 1 && header.dim(variable.dims[0]).name == variable.name) return true;
  const Role role = role_of(variable);
  if (role == Role::latitude || role == Role::longitude || role == Role::projected) return true;
  for (const nc::Var& other : header.vars) {
    for (const char* name :
         {"bounds", "climatology", "coordinates", "grid_mapping", "cell_measures", "formula_terms"}) {
      for (std::string word : words(other.text(name))) {
        if (word.ends_with(':')) word.pop_back();
        if (word == variable.name) return true;
      }
    }
  }
  return false;
}

}  // namespace windrow::cf
