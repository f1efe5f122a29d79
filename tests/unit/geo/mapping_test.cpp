// Grid mappings read from CF attributes and from crs_wkt: printed values, units of the axes, agreement, refusals.
#include <doctest/doctest.h>

#include <cmath>

#include "windrow/base/error.h"
#include "windrow/geo/crs.h"

using namespace windrow;

namespace {

using Attributes = decltype(geo::GridMapping::attributes);

const Attributes kWgs84{{"semi_major_axis", 6378137.0}, {"inverse_flattening", 298.257223563}};
const Attributes kSphere{{"earth_radius", 6371229.0}};
const double kUsFoot_m = 1200.0 / 3937.0;

geo::GridMapping mapping(const std::string& name, Attributes attributes, const Attributes& earth = {}) {
  attributes.insert(attributes.end(), earth.begin(), earth.end());
  return {name, std::move(attributes)};
}

geo::GridMapping without(geo::GridMapping m, const std::string& name) {
  std::erase_if(m.attributes, [&](const auto& attribute) { return attribute.first == name; });
  return m;
}

geo::GridMapping with(geo::GridMapping m, const std::string& name,
                      std::variant<std::string, double, std::vector<double>> value) {
  m = without(std::move(m), name);
  m.attributes.emplace_back(name, std::move(value));
  return m;
}

/// What is said against a mapping, without the place.
std::string said(const geo::GridMapping& m, const std::string& units = "m") {
  try {
    geo::crs_from_mapping(m, units, "tas.nc, crs");
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::data);
    const std::string what = e.what();
    CHECK(what.find('\n') == std::string::npos);
    REQUIRE(what.starts_with("tas.nc, crs"));
    return what.substr(11);
  }
  return "accepted";
}

std::pair<double, double> projected(const geo::Crs& crs, double lon, double lat) {
  std::vector<double> x = {lon}, y = {lat};
  crs.from_geographic(x, y);
  return {x[0], y[0]};
}

const geo::GridMapping kConic = mapping("lambert_conformal_conic",
                                        {{"standard_parallel", std::vector<double>{30.0, 60.0}},
                                         {"latitude_of_projection_origin", 48.0},
                                         {"longitude_of_central_meridian", 9.0}},
                                        kSphere);
const geo::GridMapping kPolar = mapping(
    "polar_stereographic",
    {{"latitude_of_projection_origin", 90.0}, {"longitude_of_projection_origin", -45.0}, {"standard_parallel", 70.0}},
    kWgs84);
const geo::GridMapping kSatellite = mapping("geostationary",
                                            {{"latitude_of_projection_origin", 0.0},
                                             {"longitude_of_projection_origin", 0.0},
                                             {"perspective_point_height", 35785831.0},
                                             {"sweep_angle_axis", "y"}},
                                            kWgs84);

struct Printed {
  const char* what;
  geo::GridMapping mapping;
  const char* units;
  double latitude, longitude, east, north, half_digit;
};

/// IOGP Guidance Note 7-2, worked examples of the named methods, their parameters as CF attributes; the tolerance is
/// half of the last printed digit.
std::vector<Printed> printed_examples() {
  return {
      {"9802 Lambert conic conformal 2SP",
       mapping("lambert_conformal_conic", {{"standard_parallel", std::vector<double>{28 + 23 / 60.0, 30 + 17 / 60.0}},
                                           {"latitude_of_projection_origin", 27 + 50 / 60.0},
                                           {"longitude_of_central_meridian", -99.0},
                                           {"false_easting", 2000000.0},
                                           {"false_northing", 0.0},
                                           {"reference_ellipsoid_name", "Clarke 1866"}}),
       "US_survey_foot", 28.5, -96, 2963503.91, 254759.80, 0.005},
      {"9810 polar stereographic A",
       mapping("polar_stereographic",
               {{"latitude_of_projection_origin", 90.0},
                {"longitude_of_projection_origin", 0.0},
                {"scale_factor_at_projection_origin", 0.994},
                {"false_easting", 2e6},
                {"false_northing", 2e6}},
               kWgs84),
       "m", 73, 44, 3320416.75, 632668.43, 0.005},
      {"9829 polar stereographic B",
       mapping("polar_stereographic",
               {{"straight_vertical_longitude_from_pole", 70.0},
                {"standard_parallel", -71.0},
                {"false_easting", 6e6},
                {"false_northing", 6e6}},
               kWgs84),
       "m", -75, 120, 7255380.79, 7053389.56, 0.005},
      {"9820 Lambert azimuthal equal area",
       mapping("lambert_azimuthal_equal_area",
               {{"latitude_of_projection_origin", 52.0},
                {"longitude_of_projection_origin", 10.0},
                {"false_easting", 4321000.0},
                {"false_northing", 3210000.0},
                {"horizontal_datum_name", "European Terrestrial Reference System 1989"}}),
       "m", 50, 5, 3962799.45, 2999718.85, 0.005},
      {"9822 Albers equal area, Great Lakes, in kilometres",
       mapping("albers_conical_equal_area", {{"standard_parallel", std::vector<double>{42.122774, 49.01518}},
                                             {"latitude_of_projection_origin", 45.568977},
                                             {"longitude_of_central_meridian", -84.455955},
                                             {"false_easting", 1000.0},
                                             {"false_northing", 1000.0},
                                             {"reference_ellipsoid_name", "GRS 1980"}}),
       "km", 42.75, -78.75, 1466.493492, 702.903006, 0.0000005}};
}

}  // namespace

TEST_CASE("CF attributes give the values printed in IOGP GN 7-2, both ways") {
  for (const Printed& p : printed_examples()) {
    CAPTURE(p.what);
    const geo::Crs crs = geo::crs_from_mapping(p.mapping, p.units, "test");
    CHECK(crs.projected);
    const auto [east, north] = projected(crs, p.longitude, p.latitude);
    CHECK(std::abs(east - p.east) <= p.half_digit);
    CHECK(std::abs(north - p.north) <= p.half_digit);
    std::vector<double> x = {east}, y = {north};
    crs.to_geographic(x, y);
    CHECK(std::abs(x[0] - p.longitude) < 1e-8);
    CHECK(std::abs(y[0] - p.latitude) < 1e-8);
    // What would be written is what was read.
    CHECK(crs.grid_mapping.name == p.mapping.name);
    const geo::Crs again = geo::crs_from_mapping(crs.grid_mapping, p.units, "test");
    CHECK(std::abs(projected(again, p.longitude, p.latitude).first - east) < 1e-7);
  }
}

TEST_CASE("units of the axes scale coordinates and nothing else") {
  const auto [x, y] = projected(geo::crs_from_mapping(kConic, "m", "t"), 12, 50);
  for (const auto& [units, metres] : {std::pair{"km", 1000.0}, std::pair{"US_survey_foot", kUsFoot_m},
                                      std::pair{"metres", 1.0}, std::pair{"100 km", 1e5}}) {
    const auto& told = units;  // a lambda cannot capture a binding
    CAPTURE(told);
    const auto [u, v] = projected(geo::crs_from_mapping(kConic, units, "t"), 12, 50);
    CHECK(u * metres == doctest::Approx(x).epsilon(1e-14));
    CHECK(v * metres == doctest::Approx(y).epsilon(1e-14));
  }
  CHECK(geo::crs_from_mapping(kConic, "km", "t").units == "km");
  // A scan angle times the height of the viewpoint is the coordinate in metres (CF 1.13 appendix F).
  const auto [m, n] = projected(geo::crs_from_mapping(kSatellite, "m", "t"), 20, 30);
  const geo::Crs scanned = geo::crs_from_mapping(kSatellite, "radian", "t");
  const auto [a, b] = projected(scanned, 20, 30);
  CHECK(a * 35785831.0 == doctest::Approx(m).epsilon(1e-14));
  CHECK(b * 35785831.0 == doctest::Approx(n).epsilon(1e-14));
  CHECK(scanned.units == "radian");
  CHECK(said(kConic, "radian") ==
        ": x and y are in 'radian'; expected a unit of length, or add grid = { units = \"...\" } to the [[run]]");
  CHECK(said(kConic, "") ==
        ": x and y have no units; expected a unit of length, or add grid = { units = \"...\" } to the [[run]]");
  CHECK(said(kConic, "furlongz").find("x and y are in 'furlongz'") != std::string::npos);
}

TEST_CASE("a CRS given as text takes coordinates in the units of the file") {
  const auto [x, y] = projected(geo::make_crs("EPSG:3035", "t"), 12, 50);
  for (const auto& [units, metres] :
       {std::pair{"m", 1.0}, std::pair{"km", 1000.0}, std::pair{"US_survey_foot", kUsFoot_m}}) {
    const auto& told = units;  // a lambda cannot capture a binding
    CAPTURE(told);
    const geo::Crs crs = geo::crs_with_units("EPSG:3035", units, "t");
    const auto [u, v] = projected(crs, 12, 50);
    CHECK(u * metres == doctest::Approx(x).epsilon(1e-14));
    CHECK(v * metres == doctest::Approx(y).epsilon(1e-14));
    CHECK(crs.units == units);
    CHECK(geo::make_crs(crs.wkt, "t").units == units);
  }
  // Feet of the system, metres of the file.
  const auto [east, north] = projected(geo::crs_with_units("EPSG:32040", "m", "t"), -96, 28.5);
  CHECK(std::abs(east / kUsFoot_m - 2963503.91) < 0.005);
  CHECK(std::abs(north / kUsFoot_m - 254759.80) < 0.005);
  CHECK_FALSE(geo::crs_with_units("EPSG:4326", "degrees_north", "t").projected);
  CHECK_THROWS_WITH(geo::crs_with_units("EPSG:4326", "m", "t"),
                    "t: x and y are in 'm'; expected degrees, or add grid = { units = \"...\" } to the [[run]]");
  CHECK_THROWS_WITH(geo::crs_with_units("lambert", "m", "t"),
                    "t: 'lambert' is no coordinate reference system; expected a code such as \"EPSG:3035\", a PROJ "
                    "string with +proj=, or WKT");
}

TEST_CASE("a rotated pole turns as its definition says") {
  // CF 1.13 appendix F: the rotated north pole stands at the given place; by default the meridian through it is 180.
  const geo::GridMapping m =
      mapping("rotated_latitude_longitude",
              {{"grid_north_pole_latitude", 39.25}, {"grid_north_pole_longitude", -162.0}}, kSphere);
  const geo::Crs crs = geo::crs_from_mapping(m, "degrees", "t");
  CHECK_FALSE(crs.projected);
  std::vector<double> x = {0, 0, 0}, y = {90, 0, -50.75};
  crs.to_geographic(x, y);
  CHECK(std::abs(std::remainder(x[0] + 162, 360)) < 1e-9);
  CHECK(std::abs(y[0] - 39.25) < 1e-9);
  CHECK(std::abs(x[1] - 18) < 1e-9);
  CHECK(std::abs(y[1] - 50.75) < 1e-9);
  CHECK(std::abs(y[2]) < 1e-9);
  CHECK(said(without(m, "grid_north_pole_latitude"), "degrees").find("has no grid_north_pole_latitude") !=
        std::string::npos);
}

TEST_CASE("the earth's shape is read from radii, flattening or names, and never guessed") {
  const geo::GridMapping bare = mapping("sinusoidal", {{"longitude_of_projection_origin", 0.0}});
  const auto shape = [&](const Attributes& earth) {
    const geo::Crs crs = geo::crs_from_mapping(mapping("sinusoidal", bare.attributes, earth), "m", "t");
    return std::pair{crs.semi_major_m, crs.inverse_flattening};
  };
  CHECK(shape({{"earth_radius", 6371229.0}}) == std::pair{6371229.0, 0.0});
  CHECK(shape({{"semi_major_axis", 6371229.0}, {"inverse_flattening", 0.0}}) == std::pair{6371229.0, 0.0});
  CHECK(shape({{"semi_major_axis", 6371229.0}, {"semi_minor_axis", 6371229.0}}) == std::pair{6371229.0, 0.0});
  CHECK(shape(kWgs84) == std::pair{6378137.0, 298.257223563});
  CHECK(shape({{"semi_major_axis", 6378137.0}, {"semi_minor_axis", 6356752.314245}}).second ==
        doctest::Approx(298.257223563).epsilon(1e-9));
  // EPSG dataset, ellipsoids 7030 and 7004.
  for (const char* name : {"WGS 84", "WGS_1984"})
    CHECK(shape({{"reference_ellipsoid_name", name}}) == std::pair{6378137.0, 298.257223563});
  CHECK(shape({{"horizontal_datum_name", "World Geodetic System 1984"}}).second == 298.257223563);
  CHECK(shape({{"geographic_crs_name", "WGS 84"}}).second == 298.257223563);
  CHECK(shape({{"reference_ellipsoid_name", "Bessel 1841"}}).second == doctest::Approx(299.1528128));
  CHECK(shape({{"reference_ellipsoid_name", "unknown"}, {"earth_radius", 6370000.0}}).first == 6370000);

  const std::string no_shape =
      ": grid mapping 'sinusoidal' does not say the earth's shape (earth_radius, or semi_major_axis with "
      "inverse_flattening or semi_minor_axis); add grid = { crs = \"...\" } to the [[run]]";
  CHECK(said(bare) == no_shape);
  CHECK(said(with(bare, "semi_major_axis", 6378137.0)) == no_shape);
  CHECK(said(with(bare, "reference_ellipsoid_name", "round")) == no_shape);
  CHECK(said(with(bare, "earth_radius", -1.0)) ==
        ": grid mapping 'sinusoidal' has earth_radius -1; expected a positive length in metres");
  CHECK(said(with(mapping("sinusoidal", bare.attributes, kWgs84), "semi_minor_axis", 6371000.0)) ==
        ": grid mapping 'sinusoidal' has semi_minor_axis 6371000, but 6356752.314 by its inverse_flattening "
        "298.257223563; expected the same");
  CHECK(said(with(mapping("sinusoidal", bare.attributes, kWgs84), "earth_radius", 6400000.0))
            .find("has earth_radius 6400000 beside an ellipsoid") != std::string::npos);
}

TEST_CASE("longitudes count from the mapping's own prime meridian") {
  geo::GridMapping m = mapping("sinusoidal", {{"longitude_of_projection_origin", 0.0}}, kSphere);
  m = with(m, "longitude_of_prime_meridian", 2.33722917);
  CHECK(std::abs(projected(geo::crs_from_mapping(m, "m", "t"), 2.33722917, 40).first) < 1e-6);
  m = with(without(m, "longitude_of_prime_meridian"), "prime_meridian_name", "Paris");
  CHECK(std::abs(projected(geo::crs_from_mapping(m, "m", "t"), 2.33722917, 40).first) < 1e-3);
  CHECK(said(with(m, "prime_meridian_name", "Kelder")).find("that PROJ does not know") != std::string::npos);
}

TEST_CASE("crs_wkt serves where single attributes do not, and must agree where they do") {
  const std::string wkt = geo::crs_from_mapping(kConic, "m", "t").wkt;
  const auto at = projected(geo::crs_from_mapping(kConic, "km", "t"), 12, 50);
  const auto same = [&](const geo::GridMapping& m) {
    const auto [u, v] = projected(geo::crs_from_mapping(m, "km", "t"), 12, 50);
    return std::hypot(u - at.first, v - at.second) < 1e-9;
  };
  CHECK(same(with(kConic, "crs_wkt", wkt)));
  CHECK(same(mapping("", {{"crs_wkt", wkt}})));
  CHECK(same(mapping("lambert", {{"crs_wkt", wkt}})));
  CHECK(same(with(without(kConic, "earth_radius"), "crs_wkt", wkt)));
  CHECK(same(with(without(kConic, "standard_parallel"), "crs_wkt", wkt)));
  // With heights: the horizontal part counts.
  const std::string compound = "COMPOUNDCRS[\"c\"," + wkt +
                               ",VERTCRS[\"h\",VDATUM[\"d\"],CS[vertical,1],"
                               "AXIS[\"gravity-related height (H)\",up],LENGTHUNIT[\"metre\",1]]]";
  CHECK(same(with(kConic, "crs_wkt", compound)));

  const geo::GridMapping other = with(kConic, "standard_parallel", std::vector<double>{30.0, 50.0});
  CHECK(said(with(other, "crs_wkt", wkt)) ==
        ": the grid mapping contradicts itself: standard_parallel is 30, 50 by the attributes and 30, 60 by crs_wkt; "
        "add grid = { crs = \"...\" } to the [[run]]");
  CHECK(said(with(with(kConic, "earth_radius", 6371000.0), "crs_wkt", wkt))
            .find("earth_radius is 6371000 by the attributes and 6371229 by crs_wkt") != std::string::npos);
  CHECK(
      said(with(kPolar, "crs_wkt", wkt))
          .find("grid_mapping_name is polar_stereographic by the attributes and lambert_conformal_conic by crs_wkt") !=
      std::string::npos);
  // A centimetre of false easting is rounding, two metres are not.
  CHECK(said(with(with(kConic, "false_easting", 0.01), "crs_wkt", wkt)) == "accepted");
  CHECK(said(with(with(kConic, "false_easting", 2.0), "crs_wkt", wkt))
            .find("false_easting is 2 by the attributes and 0 by crs_wkt") != std::string::npos);
  // Single-precision attributes are rounding too.
  CHECK(said(with(with(kConic, "latitude_of_projection_origin", 48.000001), "crs_wkt", wkt)) == "accepted");
  CHECK(said(mapping("", {{"crs_wkt", "PROJCRS[\"x\",]"}}))
            .find(", crs_wkt: PROJ does not know the coordinate reference system 'PROJCRS[\"x\",]'") == 0);
  const std::string satellite = geo::crs_from_mapping(kSatellite, "m", "t").wkt;
  CHECK(said(with(kSatellite, "crs_wkt", satellite), "radian") == "accepted");
  CHECK(said(with(with(kSatellite, "perspective_point_height", 35786023.0), "crs_wkt", satellite), "radian")
            .find("perspective_point_height is 35786023 by the attributes and 35785831 by crs_wkt") !=
        std::string::npos);
}

TEST_CASE("a mapping that says too little or the impossible is refused by the attribute") {
  CHECK(said(mapping("", {})) ==
        ": grid mapping '' has no grid_mapping_name; add grid = { crs = \"...\" } to the [[run]]");
  CHECK(said(mapping("polar_stereographical", {})) ==
        ": grid mapping 'polar_stereographical' is no projection that CF names; did you mean 'polar_stereographic'?");
  CHECK(said(mapping("healpix", {})) ==
        ": grid mapping 'healpix' is no projection that CF names; add grid = { crs = \"...\" } to the [[run]]");
  CHECK(said(without(kConic, "standard_parallel")) ==
        ": grid mapping 'lambert_conformal_conic' has no "
        "standard_parallel; add grid = { crs = \"...\" } to the [[run]]");
  CHECK(said(with(kConic, "standard_parallel", "30, 60")) ==
        ": grid mapping 'lambert_conformal_conic' has a standard_parallel that is no number");
  CHECK(said(with(kConic, "standard_parallel", std::vector<double>{30, 40, 50})) ==
        ": grid mapping 'lambert_conformal_conic' has 3 values of standard_parallel; expected one or two");
  CHECK(said(with(kConic, "latitude_of_projection_origin", std::nan(""))) ==
        ": grid mapping 'lambert_conformal_conic' has a latitude_of_projection_origin that is no number");
  CHECK(said(with(kConic, "latitude_of_projection_origin", 99.0)) ==
        ": grid mapping 'lambert_conformal_conic' has latitude_of_projection_origin 99; expected -90 to 90 degrees");
  CHECK(said(without(kPolar, "standard_parallel")) ==
        ": grid mapping 'polar_stereographic' has neither standard_parallel nor scale_factor_at_projection_origin; add "
        "grid = { crs = \"...\" } to the [[run]]");
  CHECK(said(with(kPolar, "scale_factor_at_projection_origin", 1.0)) == "accepted");
  CHECK(said(with(kPolar, "scale_factor_at_projection_origin", 0.9)) ==
        ": grid mapping 'polar_stereographic' has both standard_parallel 70 and scale_factor_at_projection_origin 0.9; "
        "expected one of them");
  CHECK(said(with(kPolar, "latitude_of_projection_origin", 70.0)) ==
        ": grid mapping 'polar_stereographic' has latitude_of_projection_origin 70; expected 90 or -90");
  CHECK(said(with(kSatellite, "sweep_angle_axis", "z")) ==
        ": grid mapping 'geostationary' has sweep_angle_axis 'z'; expected x or y");
  CHECK(
      said(without(kSatellite, "sweep_angle_axis")) ==
      ": grid mapping 'geostationary' has neither sweep_angle_axis nor fixed_angle_axis; add grid = { crs = \"...\" } "
      "to the [[run]]");
  CHECK(said(with(kSatellite, "perspective_point_height", 0.0), "radian") ==
        ": grid mapping 'geostationary' has perspective_point_height 0; expected a positive height in metres");
  // A parallel on each side of the equator at the same distance makes no cone.
  CHECK(said(with(kConic, "standard_parallel", std::vector<double>{-40.0, 40.0})) ==
        ": grid mapping 'lambert_conformal_conic' has standard_parallel -40, 40; expected parallels that a cone can "
        "touch");
}
