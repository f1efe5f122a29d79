// The CRS of a file's grid mapping, in the units of its axes: from single attributes, from crs_wkt, or checked against
// each other. What each mapping's attributes mean is in cf_projection.cpp.
#include <fmt/format.h>
#include <proj_experimental.h>

#include <cmath>
#include <numbers>

#include "axes.h"
#include "cf_projection.h"
#include "definition.h"
#include "mapping_attributes.h"
#include "proj_handles.h"
#include "windrow/base/error.h"
#include "windrow/mesh/mesh.h"
#include "windrow/units/units.h"

namespace windrow::geo {
namespace {

/// Further apart on the ground than this, two readings of one mapping are not the same (rounding of single-precision
/// attributes moves places by decimetres).
constexpr double kSamePlace_m = 1;
constexpr double kMetresPerDegree = 111195;

/// How many `wanted` one of `units` is; nothing when they do not convert.
std::optional<double> factor(const std::string& units, const char* wanted) {
  try {
    return units::conversion(units, wanted, "", "").affine.scale;
  } catch (const Error&) {
    return std::nullopt;
  }
}

[[noreturn]] void refuse_units(const std::string& units, const std::string& wanted, const std::string& place) {
  throw Error(Failure::data, place,
              units.empty()
                  ? fmt::format("x and y have no units; expected {}, or add grid = {{ units = \"...\" }} to "
                                "the [[run]]",
                                wanted)
                  : fmt::format("x and y are in '{}'; expected {}, or add grid = {{ units = \"...\" }} to the "
                                "[[run]]",
                                units, wanted));
}

double metres(const std::string& units, const std::string& place) {
  const auto found = factor(units, "m");
  if (units.empty() || !found || *found <= 0) refuse_units(units, "a unit of length", place);
  return *found;
}

void scale(std::vector<double>& values, double by) {
  for (double& v : values) v *= by;
}

/// The same CRS with coordinates in units of which one is `by` of its own.
void take_units(Crs& crs, double by, const std::string& units) {
  if (by == 1) return;
  const auto to = crs.to_geographic, from = crs.from_geographic;
  crs.to_geographic = [to, by](std::vector<double>& x, std::vector<double>& y) {
    scale(x, by);
    scale(y, by);
    to(x, y);
  };
  crs.from_geographic = [from, by](std::vector<double>& x, std::vector<double>& y) {
    from(x, y);
    scale(x, 1 / by);
    scale(y, 1 / by);
  };
  crs.units = units;
  for (auto& [name, value] : crs.grid_mapping.attributes)
    if (name == "false_easting" || name == "false_northing") std::get<double>(value) /= by;
}

double satellite_height(const Crs& crs) {
  for (const auto& [name, value] : crs.grid_mapping.attributes)
    if (name == "perspective_point_height") return std::get<double>(value);
  return 0;
}

/// Errors of a definition that stands in a data file are errors of the data.
Crs crs_of_data(const std::string& definition, const std::string& place) {
  try {
    return make_crs(definition, place);
  } catch (const Error& error) {
    if (error.kind() != Failure::job) throw;
    throw Error(Failure::data, "", error.what());
  }
}

/// The definition with linear axes of `axis_metres`, as WKT; as it is where they are so already.
std::string with_axes(const std::string& definition, double axis_metres, const std::string& unit_name,
                      const std::string& place) {
  const Context context = make_context();
  PJ_CONTEXT* c = context.get();
  const Pj crs = create_crs(c, complete_definition(definition, place));
  const auto axes = crs ? axes_of(c, crs.get()) : std::vector<Axis>{};
  if (axes.empty() || std::abs(axes[0].factor - axis_metres) <= 1e-15 * axis_metres) return definition;
  const Pj other(proj_crs_alter_cs_linear_unit(c, crs.get(), unit_name.c_str(), axis_metres, nullptr, nullptr));
  const char* const one_line[] = {"MULTILINE=NO", nullptr};
  const char* wkt = other ? proj_as_wkt(c, other.get(), PJ_WKT2_2019, one_line) : nullptr;
  return wkt ? wkt : definition;
}

/// WKT of the part in the plane or on the globe where there are heights as well; the text itself otherwise.
std::string horizontal_part(const std::string& wkt) {
  const Context context = make_context();
  PJ_CONTEXT* c = context.get();
  Pj crs = create_crs(c, wkt);
  if (crs && proj_get_type(crs.get()) == PJ_TYPE_COMPOUND_CRS) crs.reset(proj_crs_get_sub_crs(c, crs.get(), 0));
  if (crs && proj_get_type(crs.get()) == PJ_TYPE_GEOGRAPHIC_3D_CRS)
    crs.reset(proj_crs_demote_to_2D(c, nullptr, crs.get()));
  const char* const one_line[] = {"MULTILINE=NO", nullptr};
  const char* out = crs ? proj_as_wkt(c, crs.get(), PJ_WKT2_2019, one_line) : nullptr;
  return out ? out : wkt;
}

Crs from_rotation(const MappingAttributes& a, const std::string& axis_units, const std::string& place) {
  const mesh::Rotation rotation{a.required("grid_north_pole_longitude"), a.required("grid_north_pole_latitude"),
                                a.number("north_pole_grid_longitude").value_or(0)};
  if (std::abs(rotation.pole_lat_deg) > 90)
    a.fail(fmt::format("has grid_north_pole_latitude {}; expected -90 to 90 degrees", rotation.pole_lat_deg));
  Crs out = crs_of_data("+proj=longlat" + earth_shape(a), place);
  const auto degrees = factor(axis_units, "degree");
  if (!axis_units.empty() && !degrees) refuse_units(axis_units, "degrees", place);
  out.name = a.name();
  out.definition = fmt::format("rotated pole at longitude {}, latitude {}, grid longitude {}", rotation.pole_lon_deg,
                               rotation.pole_lat_deg, rotation.north_pole_grid_lon_deg);
  const auto shape = out.grid_mapping.attributes;
  out.grid_mapping = {a.name(),
                      {{"grid_north_pole_latitude", rotation.pole_lat_deg},
                       {"grid_north_pole_longitude", rotation.pole_lon_deg},
                       {"north_pole_grid_longitude", rotation.north_pole_grid_lon_deg}}};
  out.grid_mapping.attributes.insert(out.grid_mapping.attributes.end(), shape.begin(), shape.end());
  const Context context = make_context();
  const Pj turned = create_crs(
      context.get(),
      fmt::format("+proj=ob_tran +o_proj=longlat +o_lat_p={} +o_lon_p={} +lon_0={}{} +type=crs", rotation.pole_lat_deg,
                  rotation.north_pole_grid_lon_deg, 180 + rotation.pole_lon_deg, earth_shape(a)));
  const char* const one_line[] = {"MULTILINE=NO", nullptr};
  const char* wkt = turned ? proj_as_wkt(context.get(), turned.get(), PJ_WKT2_2019, one_line) : nullptr;
  if (wkt) out.wkt = wkt;
  // The pole's longitude counts from the mapping's own prime meridian.
  out.to_geographic = [turn = mesh::rotated_projector(rotation), shift = out.to_geographic](auto& x, auto& y) {
    turn(x, y);
    shift(x, y);
  };
  out.from_geographic = [turn = mesh::geographic_to_rotated_projector(rotation), shift = out.from_geographic](auto& x,
                                                                                                              auto& y) {
    shift(x, y);
    turn(x, y);
  };
  take_units(out, degrees.value_or(1), axis_units);
  return out;
}

Crs from_attributes(const MappingAttributes& a, const std::string& axis_units, const std::string& place) {
  if (a.name().empty()) a.fail(fmt::format("has no grid_mapping_name; {}", kAddCrs));
  if (a.name() == "rotated_latitude_longitude") return from_rotation(a, axis_units, place);
  if (a.name() == "latitude_longitude") {
    Crs out = crs_of_data("+proj=longlat" + earth_shape(a), place);
    const auto degrees = factor(axis_units, "degree");
    if (!axis_units.empty() && !degrees) refuse_units(axis_units, "degrees", place);
    take_units(out, degrees.value_or(1), axis_units);
    return out;
  }
  const auto radians = a.name() == "geostationary" ? factor(axis_units, "radian") : std::nullopt;
  if (!radians) {
    // What the mapping lacks is told before what its axes lack.
    (void)cf_projection(a, 1);
    return crs_of_data(cf_projection(a, metres(axis_units, place)) + earth_shape(a), place);
  }
  const double scan_metres = *radians * scan_height_m(a);
  Crs out = crs_of_data(cf_projection(a, 1) + earth_shape(a), place);
  take_units(out, scan_metres, axis_units);
  return out;
}

std::string number_text(const std::variant<std::string, double, std::vector<double>>& value) {
  if (const auto* text = std::get_if<std::string>(&value)) return "'" + *text + "'";
  if (const auto* one = std::get_if<double>(&value)) return fmt::format("{}", *one);
  return fmt::format("{}", fmt::join(std::get<std::vector<double>>(value), ", "));
}

/// "standard_parallel is 50 by the attributes and 60 by crs_wkt", or nothing when all that can be compared agrees.
std::string differing_attribute(const GridMapping& attributes, const GridMapping& wkt) {
  if (wkt.name.empty()) return "";
  if (attributes.name != wkt.name)
    return fmt::format("grid_mapping_name is {} by the attributes and {} by crs_wkt", attributes.name, wkt.name);
  for (const auto& [name, value] : attributes.attributes)
    for (const auto& [other, theirs] : wkt.attributes) {
      if (name != other || value == theirs) continue;
      const auto *a = std::get_if<double>(&value), *b = std::get_if<double>(&theirs);
      if (a && b && std::abs(*a - *b) <= 1e-6 * std::max(1.0, std::abs(*a))) continue;
      return fmt::format("{} is {} by the attributes and {} by crs_wkt", name, number_text(value), number_text(theirs));
    }
  return "";
}

double false_origin(const Crs& crs, const std::string& key) {
  for (const auto& [name, value] : crs.grid_mapping.attributes)
    if (name == key) return std::get<double>(value);
  return 0;
}

/// Places about the centre of the projection, `reach` units of its axes apart, must lie alike on the ground.
void compare(const Crs& attributes, const Crs& wkt, double reach, const std::string& place) {
  std::vector<double> x, y;
  for (const int i : {-1, 0, 1})
    for (const int j : {-1, 0, 1}) {
      x.push_back(false_origin(attributes, "false_easting") + i * reach);
      y.push_back(false_origin(attributes, "false_northing") + j * reach);
    }
  auto x1 = x, y1 = y, x2 = x, y2 = y;
  attributes.to_geographic(x1, y1);
  wkt.to_geographic(x2, y2);
  for (std::size_t i = 0; i < x.size(); ++i) {
    if (!std::isfinite(x1[i]) && !std::isfinite(x2[i])) continue;
    const double east = std::remainder(x1[i] - x2[i], 360) * std::cos(y1[i] / 180 * std::numbers::pi);
    const double apart = kMetresPerDegree * std::hypot(east, y1[i] - y2[i]);
    if (apart <= kSamePlace_m) continue;
    std::string what = differing_attribute(attributes.grid_mapping, wkt.grid_mapping);
    if (what.empty())
      what =
          fmt::format("x {:g}, y {:g} lies at {:.6f} E, {:.6f} N by the attributes and {:.6f} E, {:.6f} N by crs_wkt",
                      x[i], y[i], x1[i], y1[i], x2[i], y2[i]);
    throw Error(Failure::data, place, fmt::format("the grid mapping contradicts itself: {}; {}", what, kAddCrs));
  }
}

}  // namespace

Crs crs_with_units(const std::string& definition, const std::string& axis_units, const std::string& place) {
  Crs crs = make_crs(definition, place);
  if (!crs.projected) {
    const auto degrees = factor(axis_units, "degree");
    if (!axis_units.empty() && !degrees) refuse_units(axis_units, "degrees", place);
    take_units(crs, degrees.value_or(1), axis_units);
    return crs;
  }
  if (crs.grid_mapping.name == "geostationary")
    if (const auto radians = factor(axis_units, "radian")) {
      take_units(crs, *radians * satellite_height(crs), axis_units);
      return crs;
    }
  const std::string other = with_axes(definition, metres(axis_units, place), axis_units, place);
  if (other != definition) {
    crs = make_crs(other, place);
    crs.definition = definition;
  }
  return crs;
}

Crs crs_from_mapping(const GridMapping& mapping, const std::string& axis_units, const std::string& place) {
  const MappingAttributes attributes(mapping, place);
  const auto wkt = attributes.text("crs_wkt");
  if (!wkt) return from_attributes(attributes, axis_units, place);
  const auto from_wkt = [&] {
    try {
      return crs_with_units(horizontal_part(*wkt), axis_units, place + ", crs_wkt");
    } catch (const Error& error) {
      if (error.kind() != Failure::job) throw;
      throw Error(Failure::data, "", error.what());
    }
  };
  // CF's attributes of an oblique Mercator projection leave open how its axes are turned: the WKT says it.
  if (mapping.name == "oblique_mercator") return from_wkt();
  std::optional<Crs> single;
  try {
    single = from_attributes(attributes, axis_units, place);
  } catch (const Error& error) {
    if (error.kind() != Failure::data) throw;
  }
  // PROJ's WKT of a rotated pole cannot be a mesh's system.
  if (mapping.name == "rotated_latitude_longitude" && single) return *single;
  if (!single) return from_wkt();
  // A thousand kilometres; of longitude and latitude, 40 degrees.
  const double unit = factor(axis_units, "m").value_or(1);
  const double scan = mapping.name == "geostationary" && factor(axis_units, "radian")
                          ? *factor(axis_units, "radian") * scan_height_m(attributes)
                          : unit;
  compare(*single, from_wkt(), single->projected ? 1e6 / scan : 40, place);
  return *single;
}

}  // namespace windrow::geo
