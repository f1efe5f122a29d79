// Recognising axes. CF 1.13 sections 4.1-4.4 (units decide for latitude, longitude and time), 5.6 (grid mappings).
#include "axes.h"

#include <fmt/format.h>

#include <algorithm>

namespace windrow::cf {

namespace {

/// Roles that one dimension alone can have, from metadata and, within a mapping, from what that calls for.
Role role_within(const nc::Var& var, const Mapping& mapping, const GridHints& hints) {
  const Role role = role_of(var);
  if (role != Role::unknown) return role;
  const std::string axis = lower(var.text("axis"));
  if (axis != "x" && axis != "y") return role;
  if (mapping.kind == Mapping::Kind::rotated || hints.pole)
    return axis == "x" ? Role::grid_longitude : Role::grid_latitude;
  if (mapping.kind == Mapping::Kind::projected || !hints.crs.empty()) return axis == "x" ? Role::x : Role::y;
  return role;
}

/// A role by name alone, where the mapping leaves room for it.
Role name_within(const std::string& name, const Mapping& mapping, const GridHints& hints) {
  const Role role = role_by_name(name);
  const bool rotated = mapping.kind == Mapping::Kind::rotated || hints.pole;
  const bool projected = mapping.kind == Mapping::Kind::projected || !hints.crs.empty();
  if (role == Role::x || role == Role::y) return projected ? role : Role::unknown;
  if (role == Role::grid_latitude || role == Role::grid_longitude) return rotated ? role : Role::unknown;
  return role;
}

/// Numeric 1-D variables over the dimension: its own coordinate variable first, then those the variable's `coordinates`
/// attribute names, then the others.
std::vector<const nc::Var*> candidates(const Header& header, const nc::Var& variable, const nc::Dim& dim) {
  const std::vector<std::string> listed = words(variable.text("coordinates"));
  const auto rank = [&](const nc::Var& var) {
    return var.name == dim.name ? 0 : std::ranges::find(listed, var.name) != listed.end() ? 1 : 2;
  };
  std::vector<const nc::Var*> found;
  for (const nc::Var& var : header.vars)
    if (var.name != variable.name && var.dims.size() == 1 && var.dims[0] == dim.id && is_number(var) &&
        var.text("compress").empty())
      found.push_back(&var);
  std::ranges::stable_sort(found, {}, [&](const nc::Var* var) { return rank(*var); });
  return found;
}

bool decodable(const std::string& units) {
  const std::string text = lower(units);
  for (const char* word : {" since ", "@", " after ", " from ", " ref "})
    if (text.find(word) != std::string::npos) return true;
  return false;
}

[[noreturn]] void refuse_dimension(const Context& context, const Axis& axis) {
  const nc::Dim& dim = *axis.dim;
  if (axis.role == Role::vertical)
    context.fail(fmt::format("{} levels along '{}'{}; a field with a single level is needed", dim.length, dim.name,
                             axis.values != nullptr && !axis.values->text("units").empty()
                                 ? " (" + axis.values->text("units") + ")"
                                 : std::string()));
  if (axis.values == nullptr && role_by_name(dim.name) == Role::time)
    context.fail(fmt::format("dimension '{}' has no coordinate variable, so its values are not known", dim.name));
  context.fail(fmt::format("further dimension '{}' of length {}; only dimensions of length 1 can be dropped", dim.name,
                           dim.length));
}

}  // namespace

void Context::fail(const std::string& text) const {
  throw Error(Failure::data, header().path, fmt::format("variable '{}': {}", variable.name, text));
}

const Axis* Context::axis(Role role) const {
  const Axis* found = nullptr;
  for (const Axis& candidate : axes) {
    if (candidate.role != role || candidate.values == nullptr) continue;
    if (found != nullptr && candidate.dim->length == 1) continue;  // e.g. a forecast reference time beside time
    if (found != nullptr && found->dim->length > 1)
      fail(
          fmt::format("both '{}' and '{}' look like {}", found->values->name, candidate.values->name, role_text(role)));
    found = &candidate;
  }
  return found;
}

Mapping mapping_of(const Header& header, const nc::Var& variable, Remarks& remarks) {
  // "crs", or "crs: x y other: lat lon" (CF 1.13 section 5.6): there the one of the variable's own axes.
  const std::vector<std::string> list = words(variable.text("grid_mapping"));
  std::string name = list.empty() ? "" : list[0];
  for (std::size_t i = 0, key = 0; i < list.size() && list[0].ends_with(':'); ++i) {
    if (list[i].ends_with(':')) {
      key = i;
      continue;
    }
    const nc::Var* coordinate = header.find(list[i]);
    if (coordinate == nullptr || coordinate->dims.size() != 1 || header.dim(coordinate->dims[0]).name != list[i])
      continue;
    name = list[key];
    break;
  }
  if (name.ends_with(':')) name.pop_back();
  if (name.empty()) return {};
  const nc::Var* var = header.find(name);
  if (var == nullptr) {
    remarks.push_back(fmt::format("grid mapping '{}' of '{}' is not in the file", name, variable.name));
    return {};
  }
  Mapping mapping{Mapping::Kind::none, lower(var->text("grid_mapping_name")), var};
  const std::string wkt = var->text("crs_wkt");
  if (mapping.name == "latitude_longitude" || (mapping.name.empty() && wkt.starts_with("GEO"))) {
    mapping.kind = Mapping::Kind::latlon;
  } else if (mapping.name == "rotated_latitude_longitude") {
    mapping.kind = Mapping::Kind::rotated;
  } else if (mapping.name == "healpix") {
    mapping.kind = Mapping::Kind::healpix;
  } else if (mapping.name == "reduced_gaussian") {
    return {};  // its cells are told by their latitudes and longitudes
  } else if (!mapping.name.empty() || !wkt.empty()) {
    mapping.kind = Mapping::Kind::projected;
    if (mapping.name.empty()) mapping.name = "crs_wkt";
  } else {
    remarks.push_back(
        fmt::format("grid mapping '{}' has neither grid_mapping_name nor crs_wkt and says nothing", name));
    return {};
  }
  return mapping;
}

std::vector<Axis> axes_of(const Inputs& inputs, const nc::Var& variable, const std::vector<int>& dims,
                          const Mapping& mapping, const GridHints& hints, Remarks& remarks) {
  const auto axis_of = [&](const nc::Dim& dim) -> Axis {
    const std::vector<const nc::Var*> found = candidates(inputs.header(), variable, dim);
    if (!found.empty() && found[0]->name == dim.name) {
      const Role role = role_within(*found[0], mapping, hints);
      if (role != Role::unknown) return {&dim, role, found[0]};
    }
    Axis auxiliary{&dim, Role::unknown, found.empty() ? nullptr : found[0]};
    for (const nc::Var* var : found) {
      const Role role = role_within(*var, mapping, hints);
      if (role == Role::unknown || role == Role::vertical) continue;
      const bool both = (auxiliary.role == Role::latitude && role == Role::longitude) ||
                        (auxiliary.role == Role::longitude && role == Role::latitude);
      if (both) return {&dim, Role::unknown, found[0]};  // a list of places, no axis
      if (auxiliary.role == Role::unknown) auxiliary = {&dim, role, var};
    }
    if (auxiliary.role != Role::unknown) return auxiliary;
    for (const nc::Var* var : found) {
      const Role role = name_within(var->name, mapping, hints);
      if (role == Role::unknown) continue;
      if (role != Role::vertical)
        remarks.push_back(
            fmt::format("'{}' is taken for {} by its name alone: it has no units, standard_name or axis that says so",
                        var->name, role_text(role)));
      return {&dim, role, var};
    }
    return auxiliary;
  };
  refuse_repeated_dims(inputs.header(), variable, inputs.header().path);
  std::vector<Axis> axes;
  for (const int id : dims) axes.push_back(axis_of(inputs.header().dim(id)));
  return axes;
}

std::optional<LatLonPair> latlon_pair(const Context& context, std::size_t rank) {
  /// The dimensions the variable shares with the coordinate; nothing when it varies along others.
  const auto shared = [&](const nc::Var& var) -> std::optional<std::vector<int>> {
    std::vector<int> dims;
    for (const Axis& axis : context.axes) {
      const bool has = std::ranges::find(var.dims, axis.dim->id) != var.dims.end();
      const bool passing = axis.role == Role::time || axis.role == Role::vertical;
      if (has && passing && axis.dim->length > 1) return std::nullopt;
      if (has && !passing) dims.push_back(axis.dim->id);
    }
    for (const int id : var.dims)
      if (std::ranges::find(dims, id) == dims.end() && context.header().dim(id).length != 1) return std::nullopt;
    if (dims.size() != rank) return std::nullopt;
    return dims;
  };
  const std::vector<std::string> listed = words(context.variable.text("coordinates"));
  std::vector<LatLonPair> pairs;
  bool named = false;
  for (const nc::Var& latitude : context.header().vars) {
    if (role_of(latitude) != Role::latitude || !is_number(latitude)) continue;
    const auto dims = shared(latitude);
    if (!dims) continue;
    for (const nc::Var& longitude : context.header().vars) {
      if (role_of(longitude) != Role::longitude || !is_number(longitude) || shared(longitude) != dims) continue;
      const bool both = std::ranges::find(listed, latitude.name) != listed.end() &&
                        std::ranges::find(listed, longitude.name) != listed.end();
      if (both && !named) pairs.clear();
      if (both || !named) pairs.push_back({&latitude, &longitude, *dims});
      named = named || both;
    }
  }
  if (pairs.empty()) return std::nullopt;
  if (pairs.size() > 1 && rank > 0)
    context.fail(fmt::format(
        "'{}', '{}' and '{}', '{}' could all be its coordinates; its attribute coordinates should "
        "name one latitude and one longitude",
        pairs[0].latitude->name, pairs[0].longitude->name, pairs.back().latitude->name, pairs.back().longitude->name));
  return pairs[0];
}

TimeAxis time_axis_of(const Context& context, const std::vector<int>& horizontal) {
  TimeAxis result;
  const auto is_horizontal = [&](const Axis& axis) {
    return std::ranges::find(horizontal, axis.dim->id) != horizontal.end();
  };
  const Axis* time = context.axis(Role::time);
  if (time != nullptr && !is_horizontal(*time)) {
    const std::string units = time->values->text("units");
    if (!decodable(units) && time->dim->length > 1)
      context.fail(fmt::format("time axis '{}' has the units '{}', which name no date; expected '<unit> since <date>'",
                               time->values->name, units));
    if (decodable(units))
      result = {time - context.axes.data(), time->values};
    else
      context.remarks.push_back(fmt::format(
          "the single time step of '{}' has the units '{}', which name no date: '{}' is read as a fixed field",
          time->values->name, units, context.variable.name));
  }
  for (std::size_t i = 0; i < context.axes.size(); ++i) {
    const Axis& axis = context.axes[i];
    if (is_horizontal(axis)) {
      if (axis.dim->length == 0) context.fail(fmt::format("dimension '{}' is empty", axis.dim->name));
      continue;
    }
    if (std::ptrdiff_t(i) != result.position && axis.dim->length != 1) refuse_dimension(context, axis);
  }
  return result;
}

}  // namespace windrow::cf
