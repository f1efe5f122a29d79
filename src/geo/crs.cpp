// Coordinate reference systems through PROJ: recognition, ellipsoid, units, WKT. Projecting itself: projector.cpp.
#include "windrow/geo/crs.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "axes.h"
#include "definition.h"
#include "grid_mapping.h"
#include "proj_handles.h"
#include "projector.h"
#include "windrow/base/error.h"

namespace windrow::geo {

Pj create_crs(PJ_CONTEXT* context, const std::string& definition) {
  Pj crs(proj_create(context, definition.c_str()));
  while (crs && proj_get_type(crs.get()) == PJ_TYPE_BOUND_CRS) crs.reset(proj_get_source_crs(context, crs.get()));
  return crs;
}

std::vector<Axis> axes_of(PJ_CONTEXT* context, const PJ* crs) {
  std::vector<Axis> out;
  const Pj system(proj_crs_get_coordinate_system(context, crs));
  if (!system || proj_cs_get_axis_count(context, system.get()) != 2) return out;
  for (int i = 0; i < 2; ++i) {
    const char *direction = nullptr, *unit = nullptr;
    double factor = 1;
    if (!proj_cs_get_axis_info(context, system.get(), i, nullptr, nullptr, &direction, &factor, &unit, nullptr,
                               nullptr))
      return {};
    out.push_back({direction ? direction : "", unit ? unit : "", factor});
  }
  return out;
}

namespace {

/// UDUNITS' name of a length given by its metres.
std::string length_unit(double metres) {
  if (metres == 1) return "m";
  if (metres == 1000) return "km";
  if (metres == 0.3048) return "international_foot";
  if (std::abs(metres - 1200.0 / 3937.0) < 1e-15) return "US_survey_foot";
  return fmt::format("{:.17g} m", metres);
}

Shape shape_of(PJ_CONTEXT* context, const PJ* crs, const std::string& place) {
  Shape shape;
  const Pj ellipsoid(proj_get_ellipsoid(context, crs));
  double semi_minor = 0;
  int computed = 0;
  if (!ellipsoid || !proj_ellipsoid_get_parameters(context, ellipsoid.get(), &shape.semi_major_m, &semi_minor,
                                                   &computed, &shape.inverse_flattening))
    throw Error(Failure::job, place, "the coordinate reference system has no ellipsoid");
  const Pj meridian(proj_get_prime_meridian(context, crs));
  double longitude = 0, factor = std::numbers::pi / 180;
  const char* unit = nullptr;
  if (meridian && proj_prime_meridian_get_parameters(context, meridian.get(), &longitude, &factor, &unit))
    shape.prime_meridian_deg =
        unit && std::string(unit) == "degree" ? longitude : longitude * factor / std::numbers::pi * 180;
  return shape;
}

double degrees_per_unit(const std::vector<Axis>& base_axes) {
  return base_axes.empty() || base_axes[0].unit == "degree" ? 1.0 : base_axes[0].factor / std::numbers::pi * 180;
}

/// The beginning of a definition, for messages: WKT can be long.
std::string shown(const std::string& definition) {
  std::string out = definition.substr(0, 100);
  std::replace_if(
      out.begin(), out.end(), [](unsigned char ch) { return ch < 0x20 || ch == 0x7F; }, ' ');
  return out + (definition.size() > 100 ? "..." : "");
}

std::string kind_of(PJ_TYPE type) {
  switch (type) {
    case PJ_TYPE_COMPOUND_CRS:
      return "a compound one with heights: name its horizontal part";
    case PJ_TYPE_GEOGRAPHIC_3D_CRS:
      return "a three-dimensional one: name the 2-D one";
    case PJ_TYPE_GEOCENTRIC_CRS:
      return "a geocentric one";
    case PJ_TYPE_VERTICAL_CRS:
      return "a vertical one";
    default:
      return "none in the plane or on the globe";
  }
}

void check_axes(const std::vector<Axis>& axes, const std::string& place) {
  for (const Axis& axis : axes)
    if (axis.direction == "west")
      throw Error(Failure::job, place,
                  "the coordinate reference system counts westward; expected axes to east and north");
}

}  // namespace

Crs make_crs(const std::string& definition, const std::string& place) {
  const std::string complete = complete_definition(definition, place);
  const Context context = make_context();
  PJ_CONTEXT* c = context.get();
  const Pj crs = create_crs(c, complete);
  if (!crs)
    throw Error(Failure::job, place,
                fmt::format("PROJ does not know the coordinate reference system '{}'; expected a code such as "
                            "\"EPSG:3035\", a PROJ string with +proj=, or WKT",
                            shown(definition)));
  const PJ_TYPE type = proj_get_type(crs.get());
  const bool projected = type == PJ_TYPE_PROJECTED_CRS;
  if (!projected && type != PJ_TYPE_GEOGRAPHIC_2D_CRS)
    throw Error(
        Failure::job, place,
        fmt::format("'{}' is no horizontal coordinate reference system but {}", shown(definition), kind_of(type)));
  if (!projected && Pj(proj_get_source_crs(c, crs.get())))
    throw Error(Failure::job, place,
                "a geographic system with a moved pole cannot be a mesh's system; use a projection");

  Crs out;
  out.definition = definition;
  out.projected = projected;
  out.name = proj_get_name(crs.get()) ? proj_get_name(crs.get()) : "";
  const char* const one_line[] = {"MULTILINE=NO", nullptr};
  const char* wkt = proj_as_wkt(c, crs.get(), PJ_WKT2_2019, one_line);
  out.wkt = wkt ? wkt : "";
  const Shape shape = shape_of(c, crs.get(), place);
  out.semi_major_m = shape.semi_major_m;
  out.inverse_flattening = shape.inverse_flattening;

  const auto axes = axes_of(c, crs.get());
  check_axes(axes, place);
  const Pj base(proj_crs_get_geodetic_crs(c, crs.get()));
  const BaseAngles angles{degrees_per_unit(base ? axes_of(c, base.get()) : axes), shape.prime_meridian_deg};
  const double axis_metres = projected && !axes.empty() ? axes[0].factor : 1;
  out.units = projected ? length_unit(axis_metres) : "degrees";
  out.grid_mapping = projected ? projected_mapping(c, crs.get(), axis_metres, shape) : geographic_mapping(shape);
  auto pair = projected ? make_projected_pair(complete, angles, place) : make_geographic_pair(angles);
  out.to_geographic = std::move(pair.to_geographic);
  out.from_geographic = std::move(pair.from_geographic);
  return out;
}

}  // namespace windrow::geo
