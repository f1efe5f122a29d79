// The one recogniser: which kind of grid a variable is on. And the words all kinds share.
#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "grid.h"

namespace windrow::cf {

namespace {

std::string shape_text(const Context& context) {
  std::string text;
  for (const Axis& axis : context.axes) text += (text.empty() ? "" : ", ") + axis.dim->name;
  return "(" + text + ")";
}

/// Coordinates that the variable names but the file does not hold.
std::string missing_coordinates(const Context& context) {
  std::string text;
  for (const std::string& word : words(context.variable.text("coordinates")))
    if (context.header().find(word) == nullptr) text += (text.empty() ? "" : ", ") + word;
  return text;
}

[[noreturn]] void refuse(const Context& context) {
  const std::string dims = shape_text(context), absent = missing_coordinates(context);
  if (!absent.empty())
    context.fail(
        fmt::format("its coordinates {} are not in the file; name the file that holds them with grid = "
                    "{{ coordinates = \"...\" }} in the [[run]]",
                    absent));
  for (const Axis& axis : context.axes)
    if (axis.values == nullptr && axis.dim->length > 1 && role_by_name(axis.dim->name) != Role::unknown &&
        role_by_name(axis.dim->name) != Role::vertical && context.mapping.kind != Mapping::Kind::projected)
      context.fail(
          fmt::format("dimension '{}' has no coordinate variable, so its values are not known", axis.dim->name));
  for (const Axis& axis : context.axes)
    for (const nc::Var& var : context.header().vars)
      if (axis.role == Role::time && var.dims.size() == 1 && var.dims[0] == axis.dim->id &&
          role_of(var) == Role::latitude)
        context.fail(fmt::format("'{}' varies along the time dimension '{}': this is a track, not a grid", var.name,
                                 axis.dim->name));
  if (context.mapping.kind != Mapping::Kind::none && context.mapping.kind != Mapping::Kind::latlon)
    context.fail(
        fmt::format("on a {} grid (grid mapping '{}'), but its dimensions {} have no coordinate variables that "
                    "are its axes",
                    context.mapping.name, context.mapping.variable->name, dims));
  context.fail(
      fmt::format("no grid can be recognised among its dimensions {}; expected coordinates with the units "
                  "degrees_north and degrees_east, axes with a grid mapping, or a mesh; coordinates in another "
                  "file are named with grid = {{ coordinates = \"...\" }} in the [[run]]",
                  dims));
}

/// What the job says about a grid that the file shows to be of another kind.
void say_unused_hints(const Context& context, const Grid& grid) {
  const auto say = [&](const char* key, const char* what) {
    context.remarks.push_back(
        fmt::format("the job's grid.{} is not used: the file holds no {} ({})", key, what, grid.how));
  };
  if (!context.hints.crs.empty() && grid.kind != GridKind::projected) say("crs", "projected axes");
  if (!context.hints.axis_units.empty() && grid.kind != GridKind::projected) say("units", "projected axes");
  if (context.hints.pole && grid.kind != GridKind::rotated && context.axis(Role::grid_latitude) == nullptr)
    say("pole", "rotated axes");
}

}  // namespace

Places Places::all(std::size_t rows, std::size_t columns) {
  Places places;
  places.rows.resize(rows);
  places.columns.resize(columns);
  std::iota(places.rows.begin(), places.rows.end(), 0);
  std::iota(places.columns.begin(), places.columns.end(), 0);
  places.width = columns;
  return places;
}

std::optional<FileGrid> find_structured(const Context& context) {
  for (const auto find : {find_latlon, find_rotated, find_projected, find_curvilinear})
    if (auto found = find(context)) return found;
  return std::nullopt;
}

FileGrid recognise_grid(const Context& context) {
  for (const auto find : {find_ugrid, find_healpix, find_gathered, find_structured, find_listed, find_points})
    if (auto found = find(context)) {
      say_unused_hints(context, found->grid);
      return *std::move(found);
    }
  refuse(context);
}

std::string evidence(const nc::Var& variable) {
  const std::string units = variable.text("units");
  if (lower(units).starts_with("degree") && units.size() > std::string("degrees").size())
    return fmt::format("'{}' ({})", variable.name, units);
  for (const char* name : {"standard_name", "axis"})
    if (const std::string text = variable.text(name); !text.empty())
      return fmt::format("'{}' ({}{})", variable.name, name == std::string("axis") ? "axis " : "", text);
  return fmt::format("'{}' (by name)", variable.name);
}

std::string mapping_text(const Mapping& mapping) {
  if (mapping.variable == nullptr) return "no grid mapping";
  return fmt::format("grid mapping '{}' ({})", mapping.variable->name, mapping.name);
}

std::vector<Attribute> mapping_records(const Mapping& mapping) {
  std::vector<Attribute> records;
  if (mapping.variable != nullptr)
    for (const nc::Att& att : mapping.variable->attributes) records.push_back(nc::to_record(att));
  return records;
}

}  // namespace windrow::cf
