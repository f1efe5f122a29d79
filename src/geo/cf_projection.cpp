#include "cf_projection.h"

#include <fmt/format.h>

#include <cmath>
#include <map>

#include "windrow/text/words.h"

namespace windrow::geo {
namespace {

/// The attributes of one mapping on their way into a PROJ string.
class Projection {
 public:
  Projection(const MappingAttributes& attributes, const std::string& proj)
      : attributes_(attributes), text_("+proj=" + proj) {}

  [[nodiscard]] const MappingAttributes& attributes() const { return attributes_; }
  [[nodiscard]] const std::string& text() const { return text_; }

  void add(const std::string& key, double value) { text_ += fmt::format(" +{}={}", key, value); }
  void add(const std::string& key, const std::string& value) { text_ += fmt::format(" +{}={}", key, value); }

  void latitude(const std::string& key, const std::string& name) { add(key, latitude_of(name)); }
  void longitude(const std::string& key, const std::string& name) {
    const double value = attributes_.required(name);
    if (std::abs(value) > 720) attributes_.fail(fmt::format("has {} {}; expected a longitude in degrees", name, value));
    add(key, value);
  }
  [[nodiscard]] double latitude_of(const std::string& name) const { return checked(name, attributes_.required(name)); }

  /// One or two standard parallels; a single one stands for both.
  void two_parallels() {
    const std::vector<double> given = attributes_.numbers("standard_parallel");
    if (given.empty()) (void)attributes_.required("standard_parallel");
    if (given.size() > 2)
      attributes_.fail(fmt::format("has {} values of standard_parallel; expected one or two", given.size()));
    if (std::abs(given.front() + given.back()) < 1e-9)
      attributes_.fail(fmt::format("has standard_parallel {}, {}; expected parallels that a cone can touch",
                                   given.front(), given.back()));
    add("lat_1", checked("standard_parallel", given.front()));
    add("lat_2", checked("standard_parallel", given.back()));
  }

  /// Left out, a scale factor is 1.
  void scale(const std::string& name) {
    const double value = attributes_.number(name).value_or(1);
    if (value <= 0) attributes_.fail(fmt::format("has {} {}; expected a positive number", name, value));
    add("k_0", value);
  }

  /// CF wants one of both. A scale factor of 1 beside a parallel says nothing of its own.
  void parallel_or_scale() {
    const std::string parallel = "standard_parallel", factor = "scale_factor_at_projection_origin";
    const auto scaled = attributes_.number(factor);
    if (!attributes_.has(parallel) && !scaled)
      attributes_.fail(fmt::format("has neither {} nor {}; {}", parallel, factor, kAddCrs));
    if (attributes_.has(parallel) && scaled && *scaled != 1)
      attributes_.fail(fmt::format("has both {} {} and {} {}; expected one of them", parallel,
                                   attributes_.required(parallel), factor, *scaled));
    if (attributes_.has(parallel))
      latitude("lat_ts", parallel);
    else
      scale(factor);
  }

  void centre() {
    latitude("lat_0", "latitude_of_projection_origin");
    longitude("lon_0", "longitude_of_projection_origin");
  }

  void height() {
    const double value = attributes_.required("perspective_point_height");
    if (value <= 0)
      attributes_.fail(fmt::format("has perspective_point_height {}; expected a positive height in metres", value));
    add("h", value);
  }

 private:
  [[nodiscard]] double checked(const std::string& name, double value) const {
    if (std::abs(value) > 90) attributes_.fail(fmt::format("has {} {}; expected -90 to 90 degrees", name, value));
    return value;
  }

  const MappingAttributes& attributes_;
  std::string text_;
};

void conic(Projection& p) {
  p.two_parallels();
  p.latitude("lat_0", "latitude_of_projection_origin");
  p.longitude("lon_0", "longitude_of_central_meridian");
}

void azimuthal(Projection& p) { p.centre(); }

void polar_stereographic(Projection& p) {
  const MappingAttributes& a = p.attributes();
  const bool by_parallel = !a.has("latitude_of_projection_origin") && a.has("standard_parallel");
  const double where = p.latitude_of(by_parallel ? "standard_parallel" : "latitude_of_projection_origin");
  if (!by_parallel && std::abs(where) != 90)
    a.fail(fmt::format("has latitude_of_projection_origin {}; expected 90 or -90", where));
  p.add("lat_0", where < 0 ? -90.0 : 90.0);
  const char* straight = "straight_vertical_longitude_from_pole";  // deprecated since CF 1.11
  p.longitude("lon_0", a.has(straight) && !a.has("longitude_of_projection_origin") ? straight
                                                                                   : "longitude_of_projection_origin");
  p.parallel_or_scale();
}

void stereographic(Projection& p) {
  p.centre();
  p.scale("scale_factor_at_projection_origin");
}

void mercator(Projection& p) {
  p.longitude("lon_0", "longitude_of_projection_origin");
  p.parallel_or_scale();
}

void cylindrical_equal_area(Projection& p) {
  p.longitude("lon_0", "longitude_of_central_meridian");
  p.parallel_or_scale();
}

void transverse_mercator(Projection& p) {
  p.latitude("lat_0", "latitude_of_projection_origin");
  p.longitude("lon_0", "longitude_of_central_meridian");
  p.scale("scale_factor_at_central_meridian");
}

/// CF refers to PROJ's page on this projection: with the azimuth alone the axes are turned back to east and north.
void oblique_mercator(Projection& p) {
  p.latitude("lat_0", "latitude_of_projection_origin");
  p.longitude("lonc", "longitude_of_projection_origin");
  p.add("alpha", p.attributes().required("azimuth_of_central_line"));
  p.scale("scale_factor_at_projection_origin");
}

void sinusoidal(Projection& p) { p.longitude("lon_0", "longitude_of_projection_origin"); }

void vertical_perspective(Projection& p) {
  p.centre();
  p.height();
}

void geostationary(Projection& p) {
  const MappingAttributes& a = p.attributes();
  const double latitude = a.number("latitude_of_projection_origin").value_or(0);
  if (latitude != 0) a.fail(fmt::format("has latitude_of_projection_origin {}; expected 0", latitude));
  p.longitude("lon_0", "longitude_of_projection_origin");
  p.height();
  const auto sweep = a.text("sweep_angle_axis"), fixed = a.text("fixed_angle_axis");
  const std::string named = text::lower(sweep ? *sweep : fixed.value_or(""));
  if (named != "x" && named != "y")
    a.fail(named.empty()
               ? std::string("has neither sweep_angle_axis nor fixed_angle_axis; ") + kAddCrs
               : fmt::format("has {} '{}'; expected x or y", sweep ? "sweep_angle_axis" : "fixed_angle_axis", named));
  // The two axes are each other's complement.
  p.add("sweep", std::string((named == "x") == sweep.has_value() ? "x" : "y"));
}

struct Known {
  const char* proj;
  void (*read)(Projection&);
};

const std::map<std::string, Known>& known_mappings() {
  static const std::map<std::string, Known> known{{"albers_conical_equal_area", {"aea", conic}},
                                                  {"azimuthal_equidistant", {"aeqd", azimuthal}},
                                                  {"geostationary", {"geos", geostationary}},
                                                  {"lambert_azimuthal_equal_area", {"laea", azimuthal}},
                                                  {"lambert_conformal_conic", {"lcc", conic}},
                                                  {"lambert_cylindrical_equal_area", {"cea", cylindrical_equal_area}},
                                                  {"mercator", {"merc", mercator}},
                                                  {"oblique_mercator", {"omerc", oblique_mercator}},
                                                  {"orthographic", {"ortho", azimuthal}},
                                                  {"polar_stereographic", {"stere", polar_stereographic}},
                                                  {"sinusoidal", {"sinu", sinusoidal}},
                                                  {"stereographic", {"stere", stereographic}},
                                                  {"transverse_mercator", {"tmerc", transverse_mercator}},
                                                  {"vertical_perspective", {"nsper", vertical_perspective}}};
  return known;
}

}  // namespace

std::string cf_projection(const MappingAttributes& attributes, double axis_metres) {
  const auto found = known_mappings().find(attributes.name());
  if (found == known_mappings().end()) {
    std::vector<std::string> names;
    for (const auto& [name, unused] : known_mappings()) names.push_back(name);
    const std::string nearest = text::nearest_word(attributes.name(), names);
    attributes.fail(nearest.empty() ? fmt::format("is no projection that CF names; {}", kAddCrs)
                                    : fmt::format("is no projection that CF names; did you mean '{}'?", nearest));
  }
  Projection p(attributes, found->second.proj);
  found->second.read(p);
  const double x = attributes.number("false_easting").value_or(0), y = attributes.number("false_northing").value_or(0);
  if (x != 0) p.add("x_0", x * axis_metres);
  if (y != 0) p.add("y_0", y * axis_metres);
  if (axis_metres != 1) p.add("to_meter", axis_metres);
  return p.text();
}

double scan_height_m(const MappingAttributes& attributes) { return attributes.required("perspective_point_height"); }

}  // namespace windrow::geo
