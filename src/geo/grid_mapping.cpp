// CF grid mappings from the method and parameters of a CRS's conversion. Methods and parameters are told apart by their
// EPSG codes (IOGP Guidance Note 7-2); names of attributes are those of CF Appendix F.
#include "grid_mapping.h"

#include <proj_experimental.h>

#include <cmath>
#include <cstdlib>
#include <map>
#include <numbers>
#include <optional>

namespace windrow::geo {
namespace {

using Attributes = decltype(GridMapping::attributes);

/// EPSG codes of conversion parameters.
enum Parameter {
  kLatitudeOrigin = 8801,
  kLongitudeOrigin = 8802,
  kScaleOrigin = 8805,
  kFalseEasting = 8806,
  kFalseNorthing = 8807,
  kLatitudeFalseOrigin = 8821,
  kLongitudeFalseOrigin = 8822,
  kFirstParallel = 8823,
  kSecondParallel = 8824,
  kEastingFalseOrigin = 8826,
  kNorthingFalseOrigin = 8827,
  kLatitudeCentre = 8811,
  kLongitudeCentre = 8812,
  kAzimuth = 8813,
  kRectifiedAngle = 8814,
  kScaleCentre = 8815,
  kEastingCentre = 8816,
  kNorthingCentre = 8817,
  kLatitudeParallel = 8832,
  kLongitudeOriginPolar = 8833,
  kLatitudeTopocentre = 8834,
  kLongitudeTopocentre = 8835,
  kViewpointHeight = 8840
};

/// Multiples of a unit that come out of a conversion chain as 10.000000000000002 are meant to be 10.
double tidy(double value) {
  const double rounded = std::round(value * 1e9) / 1e9;
  return std::abs(value - rounded) <= 4e-16 * std::abs(value) ? rounded : value;
}

/// A conversion's method and its parameters: angles in degrees, lengths in units of the projected axes.
struct Conversion {
  int method = 0;
  std::string method_name;
  std::map<int, double> values;
  double perspective_height_m = 0;  ///< above the ellipsoid; CF wants metres whatever the axes have

  [[nodiscard]] double at(int code, double otherwise = 0) const {
    const auto found = values.find(code);
    return found == values.end() ? otherwise : found->second;
  }
};

Conversion read_conversion(PJ_CONTEXT* context, const PJ* operation, double axis_metres) {
  Conversion out;
  const char *name = nullptr, *code = nullptr;
  if (proj_coordoperation_get_method_info(context, operation, &name, nullptr, &code)) {
    out.method_name = name ? name : "";
    out.method = code ? std::atoi(code) : 0;
  }
  const int count = proj_coordoperation_get_param_count(context, operation);
  for (int i = 0; i < count; ++i) {
    const char *label = nullptr, *parameter = nullptr, *unit = nullptr, *category = nullptr;
    double value = 0, factor = 1;
    if (!proj_coordoperation_get_param(context, operation, i, &label, nullptr, &parameter, &value, nullptr, &factor,
                                       &unit, nullptr, nullptr, &category))
      continue;
    const bool satellite = label && std::string(label) == "Satellite Height";  // EPSG has no code for it
    if (satellite || (parameter && std::atoi(parameter) == kViewpointHeight)) out.perspective_height_m = value * factor;
    if (!parameter) continue;
    const std::string kind = category ? category : "", unit_name = unit ? unit : "";
    if (kind == "angular" && unit_name != "degree") value = tidy(value * factor * 180 / std::numbers::pi);
    if (kind == "linear" && factor != axis_metres) value = tidy(value * factor / axis_metres);
    out.values[std::atoi(parameter)] = value;
  }
  return out;
}

void add_false_origin(const Conversion& c, Attributes& a, int easting = kFalseEasting, int northing = kFalseNorthing) {
  a.emplace_back("false_easting", c.at(easting));
  a.emplace_back("false_northing", c.at(northing));
}

GridMapping azimuthal(const std::string& name, const Conversion& c) {
  GridMapping m{name, {}};
  m.attributes.emplace_back("latitude_of_projection_origin", c.at(kLatitudeOrigin));
  m.attributes.emplace_back("longitude_of_projection_origin", c.at(kLongitudeOrigin));
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping conic(const std::string& name, const Conversion& c) {
  GridMapping m{name, {}};
  // Two even when equal: readers take a single one for the latitude of the origin as well.
  m.attributes.emplace_back("standard_parallel", std::vector<double>{c.at(kFirstParallel), c.at(kSecondParallel)});
  m.attributes.emplace_back("longitude_of_central_meridian", c.at(kLongitudeFalseOrigin));
  m.attributes.emplace_back("latitude_of_projection_origin", c.at(kLatitudeFalseOrigin));
  add_false_origin(c, m.attributes, kEastingFalseOrigin, kNorthingFalseOrigin);
  return m;
}

/// CF's cone has no scale factor: a single parallel with one is rewritten as the two parallels where the scale is true.
GridMapping cone_of_one_parallel(PJ_CONTEXT* context, const PJ* operation, const Conversion& c, double axis_metres) {
  if (c.at(kScaleOrigin, 1) != 1) {
    const Pj two(proj_convert_conversion_to_other_method(context, operation, 9802, nullptr));
    if (!two) return {};
    return conic("lambert_conformal_conic", read_conversion(context, two.get(), axis_metres));
  }
  GridMapping m{"lambert_conformal_conic", {}};
  m.attributes.emplace_back("standard_parallel", c.at(kLatitudeOrigin));
  m.attributes.emplace_back("longitude_of_central_meridian", c.at(kLongitudeOrigin));
  m.attributes.emplace_back("latitude_of_projection_origin", c.at(kLatitudeOrigin));
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping polar_stereographic(const Conversion& c, bool by_parallel) {
  GridMapping m{"polar_stereographic", {}};
  const double where = c.at(by_parallel ? kLatitudeParallel : kLatitudeOrigin);
  m.attributes.emplace_back("latitude_of_projection_origin", where < 0 ? -90.0 : 90.0);
  m.attributes.emplace_back("longitude_of_projection_origin",
                            c.at(by_parallel ? kLongitudeOriginPolar : kLongitudeOrigin));
  if (by_parallel)
    m.attributes.emplace_back("standard_parallel", where);
  else
    m.attributes.emplace_back("scale_factor_at_projection_origin", c.at(kScaleOrigin, 1));
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping transverse_mercator(const Conversion& c) {
  GridMapping m{"transverse_mercator", {}};
  m.attributes.emplace_back("scale_factor_at_central_meridian", c.at(kScaleOrigin, 1));
  m.attributes.emplace_back("longitude_of_central_meridian", c.at(kLongitudeOrigin));
  m.attributes.emplace_back("latitude_of_projection_origin", c.at(kLatitudeOrigin));
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping mercator(const Conversion& c, bool by_parallel) {
  GridMapping m{"mercator", {}};
  m.attributes.emplace_back("longitude_of_projection_origin", c.at(kLongitudeOrigin));
  if (by_parallel)
    m.attributes.emplace_back("standard_parallel", c.at(kFirstParallel));
  else
    m.attributes.emplace_back("scale_factor_at_projection_origin", c.at(kScaleOrigin, 1));
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping cylindrical_equal_area(const Conversion& c) {
  GridMapping m{"lambert_cylindrical_equal_area", {}};
  m.attributes.emplace_back("longitude_of_central_meridian", c.at(kLongitudeOrigin));
  m.attributes.emplace_back("standard_parallel", c.at(kFirstParallel));
  add_false_origin(c, m.attributes);
  return m;
}

/// CF has no attribute for the angle by which the axes are turned: it is the azimuth, or there is no CF mapping.
GridMapping oblique_mercator(const Conversion& c) {
  if (c.at(kRectifiedAngle) != c.at(kAzimuth)) return {};
  GridMapping m{"oblique_mercator", {}};
  m.attributes.emplace_back("azimuth_of_central_line", c.at(kAzimuth));
  m.attributes.emplace_back("latitude_of_projection_origin", c.at(kLatitudeCentre));
  m.attributes.emplace_back("longitude_of_projection_origin", c.at(kLongitudeCentre));
  m.attributes.emplace_back("scale_factor_at_projection_origin", c.at(kScaleCentre, 1));
  add_false_origin(c, m.attributes, kEastingCentre, kNorthingCentre);
  return m;
}

GridMapping vertical_perspective(const Conversion& c) {
  GridMapping m{"vertical_perspective", {}};
  m.attributes.emplace_back("latitude_of_projection_origin", c.at(kLatitudeTopocentre));
  m.attributes.emplace_back("longitude_of_projection_origin", c.at(kLongitudeTopocentre));
  m.attributes.emplace_back("perspective_point_height", c.perspective_height_m);
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping geostationary(const Conversion& c, const std::string& sweep) {
  GridMapping m{"geostationary", {}};
  m.attributes.emplace_back("latitude_of_projection_origin", 0.0);
  m.attributes.emplace_back("longitude_of_projection_origin", c.at(kLongitudeOrigin));
  m.attributes.emplace_back("perspective_point_height", c.perspective_height_m);
  m.attributes.emplace_back("sweep_angle_axis", sweep);
  add_false_origin(c, m.attributes);
  return m;
}

GridMapping by_method(PJ_CONTEXT* context, const PJ* operation, const Conversion& c, double axis_metres) {
  switch (c.method) {
    case 9820:
    case 1027:
      return azimuthal("lambert_azimuthal_equal_area", c);
    case 9801:
      return cone_of_one_parallel(context, operation, c, axis_metres);
    case 9802:
      return conic("lambert_conformal_conic", c);
    case 9822:
      return conic("albers_conical_equal_area", c);
    case 9807:
      return transverse_mercator(c);
    case 9810:
      return polar_stereographic(c, false);
    case 9829:
      return polar_stereographic(c, true);
    case 9804:
      return c.at(kLatitudeOrigin) == 0 ? mercator(c, false) : GridMapping{};
    case 9805:
      return mercator(c, true);
    case 9834:
    case 9835:
      return cylindrical_equal_area(c);
    case 9840:
      return azimuthal("orthographic", c);
    case 9832:
      return azimuthal("azimuthal_equidistant", c);
    case 9815:
      return oblique_mercator(c);
    case 9838:
      return vertical_perspective(c);
    default:
      break;
  }
  if (c.method_name == "Geostationary Satellite (Sweep X)") return geostationary(c, "x");
  if (c.method_name == "Geostationary Satellite (Sweep Y)") return geostationary(c, "y");
  if (c.method_name == "Stereographic") {
    GridMapping m = azimuthal("stereographic", c);
    m.attributes.emplace_back("scale_factor_at_projection_origin", c.at(kScaleOrigin, 1));
    return m;
  }
  if (c.method_name == "Sinusoidal") {
    GridMapping m{"sinusoidal", {}};
    m.attributes.emplace_back("longitude_of_projection_origin", c.at(kLongitudeOrigin));
    add_false_origin(c, m.attributes);
    return m;
  }
  return {};  // CF has no name for it, or means another formula by a like name (EPSG 9809, double stereographic)
}

void add_shape(const Shape& shape, Attributes& a) {
  if (shape.inverse_flattening == 0) {
    a.emplace_back("earth_radius", shape.semi_major_m);
  } else {
    a.emplace_back("semi_major_axis", shape.semi_major_m);
    a.emplace_back("inverse_flattening", shape.inverse_flattening);
  }
  a.emplace_back("longitude_of_prime_meridian", shape.prime_meridian_deg);
}

}  // namespace

GridMapping projected_mapping(PJ_CONTEXT* context, const PJ* crs, double axis_metres, const Shape& shape) {
  const Pj operation(proj_crs_get_coordoperation(context, crs));
  if (!operation) return {};
  GridMapping m =
      by_method(context, operation.get(), read_conversion(context, operation.get(), axis_metres), axis_metres);
  if (!m.name.empty()) add_shape(shape, m.attributes);
  return m;
}

GridMapping geographic_mapping(const Shape& shape) {
  GridMapping m{"latitude_longitude", {}};
  add_shape(shape, m.attributes);
  return m;
}

}  // namespace windrow::geo
