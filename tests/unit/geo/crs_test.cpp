// Projections against printed values, laws of projectors, grid-mapping attributes and refusals.
#include <doctest/doctest.h>

#include <cmath>
#include <thread>

#include "windrow/base/error.h"
#include "windrow/geo/crs.h"

using namespace windrow;

namespace {

struct Printed {
  const char* what;
  const char* definition;
  double latitude, longitude, east, north, half_digit;
};

/// IOGP Guidance Note 7-2 (Coordinate Conversions and Transformations including Formulas), worked examples of the named
/// methods, in the units of the example; polar B, LAEA and Albers as repeated in public test tables of these examples.
/// Half of the last printed digit is the tolerance.
const Printed kPrinted[] = {
    {"9802 Lambert conic conformal 2SP, NAD27 Texas South Central, ftUS", "EPSG:32040", 28.5, -96.0, 2963503.91,
     254759.80, 0.005},
    {"9810 polar stereographic A, UPS North", "EPSG:32661", 73.0, 44.0, 3320416.75, 632668.43, 0.005},
    {"9829 polar stereographic B, Australian Antarctic", "EPSG:3032", -75.0, 120.0, 7255380.79, 7053389.56, 0.005},
    {"9820 Lambert azimuthal equal area, Europe", "EPSG:3035", 50.0, 5.0, 3962799.45, 2999718.85, 0.005},
    {"9822 Albers equal area, Great Lakes", "EPSG:3174", 42.75, -78.75, 1466493.492, 702903.006, 0.0005},
};

std::string message(const std::string& definition) {
  try {
    geo::make_crs(definition, "mesh.crs");
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::job);
    return e.what();
  }
  return "accepted";
}

double number(const geo::Crs& crs, const std::string& name) {
  for (const auto& [key, value] : crs.grid_mapping.attributes)
    if (key == name) return std::get<double>(value);
  return std::nan("");
}

}  // namespace

TEST_CASE("projectors give the values printed in IOGP GN 7-2, both ways") {
  for (const Printed& p : kPrinted) {
    CAPTURE(p.what);
    const geo::Crs crs = geo::make_crs(p.definition, "test");
    std::vector<double> x = {p.longitude}, y = {p.latitude};
    crs.from_geographic(x, y);
    CHECK(std::abs(x[0] - p.east) <= p.half_digit);
    CHECK(std::abs(y[0] - p.north) <= p.half_digit);
    x = {p.east};
    y = {p.north};
    crs.to_geographic(x, y);
    // A metre is 1e-5 degrees of latitude or less, and up to four times that in longitude at these places.
    CHECK(std::abs(x[0] - p.longitude) <= p.half_digit * 4e-5 * 1.5);
    CHECK(std::abs(y[0] - p.latitude) <= p.half_digit * 1e-5 * 1.5);
  }
}

TEST_CASE("there and back again is the identity to a millimetre") {
  // 1e-8 degrees. Most projections reach 1e-12; PROJ 9.1 cuts the authalic-latitude series of the equal-area azimuthal
  // inverse short, smoothly, at 5e-9 degrees (measured here for EPSG:3035).
  constexpr double kMillimetre_deg = 1e-8;
  for (const char* definition : {"EPSG:3035", "EPSG:32632", "EPSG:3031", "EPSG:27572", "EPSG:32040",
                                 "+proj=sinu +lon_0=10 +R=6371000", "+proj=aeqd +lat_0=50 +lon_0=5 +ellps=GRS80",
                                 "+proj=ortho +lat_0=50 +lon_0=5", "+proj=lcc +lat_1=50 +lat_0=40 +lon_0=5"}) {
    CAPTURE(definition);
    const geo::Crs crs = geo::make_crs(definition, "test");
    const bool south = std::string(definition) == "EPSG:3031";
    const bool america = std::string(definition) == "EPSG:32040";
    std::vector<double> x, y;
    for (double lon = 3; lon <= 9; lon += 1.5)
      for (double lat = 44; lat <= 52; lat += 2) {
        x.push_back(america ? lon - 105 : lon);
        y.push_back(south ? -lat - 30 : america ? lat - 18 : lat);
      }
    const auto lon = x, lat = y;
    crs.from_geographic(x, y);
    crs.to_geographic(x, y);
    for (std::size_t i = 0; i < x.size(); ++i) {
      CHECK(std::abs(x[i] - lon[i]) < kMillimetre_deg);
      CHECK(std::abs(y[i] - lat[i]) < kMillimetre_deg);
    }
  }
}

TEST_CASE("a point the projection cannot reach is NaN and leaves its neighbours alone") {
  const geo::Crs crs = geo::make_crs("+proj=ortho +lat_0=50 +lon_0=5 +R=6371000", "test");
  std::vector<double> x = {0, 7e6, 1000}, y = {0, 7e6, 1000};
  crs.to_geographic(x, y);
  CHECK(std::abs(x[0] - 5) < 1e-9);
  CHECK(std::isnan(x[1]));
  CHECK(std::isnan(y[1]));
  CHECK(std::isfinite(x[2]));
  std::vector<double> lon = {-175, 5}, lat = {-50, 50};
  crs.from_geographic(lon, lat);
  CHECK(std::isnan(lon[0]));
  CHECK(std::abs(lon[1]) < 1e-6);
}

TEST_CASE("threads projecting at the same time get the bits one thread gets") {
  const geo::Crs crs = geo::make_crs("EPSG:3035", "test");
  std::vector<double> x0, y0;
  for (int i = 0; i < 2000; ++i) {
    x0.push_back(3e6 + 1000.0 * i);
    y0.push_back(2e6 + 700.0 * i);
  }
  auto x = x0, y = y0;
  crs.to_geographic(x, y);
  std::vector<int> same(4, 0);
  std::vector<std::thread> threads;
  for (int t = 0; t < 4; ++t)
    threads.emplace_back([&, t] {
      for (int repeat = 0; repeat < 5; ++repeat) {
        auto xt = x0, yt = y0;
        crs.to_geographic(xt, yt);
        same[t] += xt == x && yt == y;
      }
    });
  for (auto& thread : threads) thread.join();
  CHECK(same == std::vector<int>(4, 5));
}

TEST_CASE("a geographic system passes degrees through, whatever order its axes are declared in") {
  for (const char* definition : {"EPSG:4326", "OGC:CRS84", "+proj=longlat +R=6371000"}) {
    const geo::Crs crs = geo::make_crs(definition, "test");
    CHECK_FALSE(crs.projected);
    CHECK(crs.units == "degrees");
    CHECK(crs.grid_mapping.name == "latitude_longitude");
    std::vector<double> x = {10.25}, y = {47.5};
    crs.to_geographic(x, y);
    CHECK(x[0] == 10.25);
    CHECK(y[0] == 47.5);
  }
}

TEST_CASE("grads and a meridian other than Greenwich become degrees east of Greenwich") {
  // NTF (Paris), EPSG:4807: grads, Paris at 2.5969213 grads = 2.33722917 degrees (EPSG prime meridian 8903).
  const geo::Crs crs = geo::make_crs("EPSG:4807", "test");
  std::vector<double> x = {10}, y = {50};
  crs.to_geographic(x, y);
  CHECK(std::abs(x[0] - (9 + 2.33722917)) < 1e-9);
  CHECK(std::abs(y[0] - 45) < 1e-12);
  // Lambert zone II's origin is the meridian of Paris at 52 grads: false easting 600 km, northing 2200 km (EPSG:27572).
  const geo::Crs zone = geo::make_crs("EPSG:27572", "test");
  std::vector<double> e = {600000}, n = {2200000};
  zone.to_geographic(e, n);
  CHECK(std::abs(e[0] - 2.33722917) < 1e-8);
  CHECK(std::abs(n[0] - 46.8) < 1e-9);
}

TEST_CASE("ellipsoid, units and WKT come from the system itself, without a datum shift") {
  const geo::Crs crs = geo::make_crs("EPSG:3035", "test");
  CHECK(crs.projected);
  CHECK(crs.units == "m");
  CHECK(crs.semi_major_m == 6378137);
  CHECK(crs.inverse_flattening == doctest::Approx(298.257222101).epsilon(1e-12));
  CHECK(crs.wkt.starts_with("PROJCRS["));
  CHECK(crs.wkt.find('\n') == std::string::npos);
  CHECK(geo::make_crs(crs.wkt, "test").wkt == crs.wkt);
  CHECK(geo::make_crs("EPSG:32040", "test").units == "US_survey_foot");
  CHECK(geo::make_crs("+proj=laea +lat_0=50 +R=6371229 +units=km", "test").units == "km");
  CHECK(geo::make_crs("+proj=laea +lat_0=50 +R=6371229", "test").inverse_flattening == 0);
  // A string with +towgs84 means the same places on its own ellipsoid.
  const geo::Crs shifted = geo::make_crs("+proj=utm +zone=32 +ellps=bessel +towgs84=598,73,418,0,0,0,0", "test");
  const geo::Crs plain = geo::make_crs("+proj=utm +zone=32 +ellps=bessel", "test");
  std::vector<double> x1 = {4e5}, y1 = {5.3e6}, x2 = x1, y2 = y1;
  shifted.to_geographic(x1, y1);
  plain.to_geographic(x2, y2);
  CHECK(x1 == x2);
  CHECK(y1 == y2);
}

TEST_CASE("one standard parallel away from the origin keeps the cone that PROJ's own formulas give") {
  // PROJ 9.1 through its plain operation for the same string (no CRS): 10E 45N -> 395392.1505, 573347.2562.
  const geo::Crs crs = geo::make_crs("+proj=lcc +lat_1=50 +lat_0=40 +lon_0=5 +ellps=GRS80", "test");
  std::vector<double> x = {10}, y = {45};
  crs.from_geographic(x, y);
  CHECK(std::abs(x[0] - 395392.1505) < 1e-3);
  CHECK(std::abs(y[0] - 573347.2562) < 1e-3);
}

TEST_CASE("grid-mapping attributes are CF's, in the units of the axes") {
  const geo::Crs laea = geo::make_crs("EPSG:3035", "test");
  CHECK(laea.grid_mapping.name == "lambert_azimuthal_equal_area");
  CHECK(number(laea, "latitude_of_projection_origin") == 52);
  CHECK(number(laea, "longitude_of_projection_origin") == 10);
  CHECK(number(laea, "false_easting") == 4321000);
  CHECK(number(laea, "false_northing") == 3210000);
  CHECK(number(laea, "longitude_of_prime_meridian") == 0);
  const geo::Crs utm = geo::make_crs("EPSG:32632", "test");
  CHECK(utm.grid_mapping.name == "transverse_mercator");
  CHECK(number(utm, "scale_factor_at_central_meridian") == 0.9996);
  const geo::Crs feet = geo::make_crs("EPSG:32040", "test");
  CHECK(number(feet, "false_easting") == 2000000);
  const geo::Crs sphere = geo::make_crs("+proj=laea +lat_0=50 +R=6371229", "test");
  CHECK(number(sphere, "earth_radius") == 6371229);
  CHECK(geo::make_crs("EPSG:3031", "test").grid_mapping.name == "polar_stereographic");
  // The double stereographic projection of the Netherlands is not CF's (Snyder's) stereographic.
  CHECK(geo::make_crs("EPSG:28992", "test").grid_mapping.name.empty());
}

TEST_CASE("what is no horizontal system is refused with what was expected") {
  CHECK(message("lambert") ==
        "mesh.crs: 'lambert' is no coordinate reference system; expected a code such as \"EPSG:3035\", a PROJ string "
        "with +proj=, or WKT");
  CHECK(
      message("EPSG:999999").starts_with("mesh.crs: PROJ does not know the coordinate reference system 'EPSG:999999'"));
  CHECK(message("EPSG:7405") ==
        "mesh.crs: 'EPSG:7405' is no horizontal coordinate reference system but a compound one "
        "with heights: name its horizontal part");
  CHECK(message("EPSG:4979").find("three-dimensional") != std::string::npos);
  CHECK(message("EPSG:4978").find("geocentric") != std::string::npos);
  CHECK(message("EPSG:5773").find("vertical") != std::string::npos);
  CHECK(message("EPSG:2053").find("counts westward") != std::string::npos);
  CHECK(message("+init=epsg:3035").find("is no coordinate reference system") != std::string::npos);
  CHECK(message("").find("is no coordinate reference system") != std::string::npos);
  CHECK(message("PROJCRS[\"x\",]") != "accepted");
}
