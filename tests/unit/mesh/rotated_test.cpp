// Laws of rotated frames, and of what every mesh says about its rim and its direction of x.
#include <doctest/doctest.h>

#include <random>

#include "azimuthal.h"
#include "globe_meshes.h"
#include "windrow/base/error.h"
#include "windrow/mesh/frame.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using namespace windrow::test;
using mesh::Earth;
using mesh::Rotation;

namespace {

const Rotation kEurope{-162, 39.25, 0};

GeoPoint at(double lambda, double phi) { return {Angle::degrees(lambda), Angle::degrees(phi)}; }

mesh::MeshPtr rotated(const mesh::LatLonEdges& edges, const Rotation& rotation) {
  return mesh::make_rotated(edges, rotation, Earth::sphere(kRadius_m), "rotated test");
}

}  // namespace

TEST_CASE("rotated positions are those of an independent implementation") {
  // Computed by PROJ 9.1.1 (through pyproj 3.4.1): inverse of ob_tran with o_proj = longlat, o_lat_p = latitude of the
  // pole, o_lon_p = north pole grid longitude, lon_0 = 180 + longitude of the pole.
  struct Case {
    Rotation rotation;
    double x, y, lon, lat;
  };
  const std::vector<Case> cases = {{{-162, 39.25, 0}, 0, 0, 18, 50.75},
                                   {{-162, 39.25, 0}, -28.21, -23.21, -9.984238315380, 22.199365026727},
                                   {{-162, 39.25, 0}, 17.9, 21.7, 64.281081557615, 66.725987856389},
                                   {{-162, 39.25, 0}, 140, -60, 54.884122408608, -57.623591316245},
                                   {{-162, 39.25, 0}, -75.5, 89, -160.745390439174, 39.493661551361},
                                   {{10, -37.5, 25}, 0, 0, 47.451901480583, 45.973819441331},
                                   {{10, -37.5, 25}, -28.21, -23.21, 98.256144364795, 42.577524496359},
                                   {{10, -37.5, 25}, 17.9, 21.7, 17.653423089967, 30.423700622152},
                                   {{10, -37.5, 25}, 140, -60, -140.946111183053, 21.073180116401},
                                   {{83, 90, -12}, 17.9, 21.7, -67.1, 21.7},
                                   {{83, 90, -12}, 140, -60, 55, -60},
                                   {{-97, 42.5, 180}, -28.21, -23.21, -156.432541288918, -59.697452979251},
                                   {{-97, 42.5, 180}, 140, -60, 63.292884641781, -17.618922737873},
                                   {{0, -90, 0}, 17.9, 21.7, -17.9, -21.7}};
  for (const Case& c : cases) {
    CAPTURE(c.rotation.pole_lon_deg);
    CAPTURE(c.x);
    std::vector<double> x{c.x}, y{c.y};
    mesh::rotated_projector(c.rotation)(x, y);
    CHECK(norm(sphere::point_degrees(x[0], y[0]) - sphere::point_degrees(c.lon, c.lat)) < 1e-13);
    mesh::geographic_to_rotated_projector(c.rotation)(x, y);
    CHECK(norm(sphere::point_degrees(x[0], y[0]) - sphere::point_degrees(c.x, c.y)) < 1e-14);
    const sphere::Vec3 own = sphere::point_degrees(c.x, c.y);
    const mesh::Frame frame(c.rotation);
    CHECK(norm(frame.to_frame(frame.from_frame(own)) - own) < 1e-15);
  }
}

TEST_CASE("a frame that is turned by nothing gives the plain latitude-longitude mesh") {
  const mesh::LatLonEdges edges{even_edges(0, 5, 72), even_edges(-90, 5, 36)};
  const auto plain = mesh::make_latlon(edges, Earth::sphere(kRadius_m), "plain");
  for (const Rotation& r : {Rotation{180, 90, 0}, Rotation{-180, 90, 0}, Rotation{10, 90, 190}}) {
    const auto m = rotated(edges, r);
    CHECK(m->digest() == plain->digest());
    CHECK(m->rotation() == nullptr);
  }
  const auto turned = rotated(edges, {170, 90, 0});
  REQUIRE(turned->rotation() != nullptr);
  CHECK(turned->digest() != plain->digest());
  CHECK(*turned->find(at(-9.9, 2)) == *plain->find(at(0.1, 2)));
}

TEST_CASE("cells of a rotated frame add up to 4 pi and keep the areas of their own frame") {
  const mesh::LatLonEdges edges{even_edges(-180, 5, 72), even_edges(-90, 4.5, 40)};
  const auto plain = mesh::make_latlon(edges, Earth::sphere(kRadius_m), "plain");
  for (const Rotation& r : {kEurope, Rotation{10, -37.5, 25}, Rotation{83, 0, 7}}) {
    const auto m = rotated(edges, r);
    ExactSum sum;
    for (std::size_t k = 0; k < m->size(); ++k) {
      const double area = sphere::area(m->cell(k));
      sum.add(area);
      CHECK(std::abs(area / plain->area(k) - 1) < 1e-12);
      CHECK(m->area(k) == plain->area(k));
      CHECK_FALSE(m->on_rim(k));
    }
    CHECK(std::abs(sum.value() / (4 * std::numbers::pi) - 1) < 1e-12);
    CHECK(unmatched_arcs(*m) == 0);
  }
}

TEST_CASE("a rotated mesh is the projected mesh of its projector") {
  const mesh::LatLonEdges edges{even_edges(-28.375, 0.44, 106), even_edges(-23.375, 0.44, 103)};
  const auto m = rotated(edges, kEurope);
  const auto projected = mesh::make_projected(edges.lon_deg, edges.lat_deg, mesh::rotated_projector(kEurope),
                                              mesh::geographic_to_rotated_projector(kEurope), Earth::sphere(kRadius_m),
                                              "rotated", "projected test");
  REQUIRE(m->size() == projected->size());
  double worst = 0;
  for (std::size_t k = 0; k < m->size(); ++k) {
    worst = std::max(worst, std::abs(m->area(k) / projected->area(k) - 1));
    CHECK(m->on_rim(k) == projected->on_rim(k));
    if (k % 97 != 0) continue;
    CHECK(m->find(m->centre(k)) == k);
    CHECK(norm(sphere::point(m->centre(k)) - sphere::point(projected->centre(k))) < 1e-15);
    CHECK(norm(*m->x_direction(k) - *projected->x_direction(k)) < 1e-6);
    CHECK(contains(m->cell(k).pieces[0], sphere::point(m->centre(k))));
  }
  CHECK(worst < 1e-11);
}

TEST_CASE("points find the rotated cell that holds them") {
  std::mt19937_64 random(5);
  std::uniform_real_distribution<double> u(0, 1);
  const auto m = rotated({even_edges(-20, 2, 20), even_edges(-20, 2, 20)}, {10, -37.5, 25});
  int inside = 0;
  for (int k = 0; k < 5000; ++k) {
    const double lambda = 360 * u(random), phi = 180 * u(random) - 90;
    const auto found = m->find(at(lambda, phi));
    CHECK(found == m->find(at(lambda - 360, phi)));
    std::optional<std::size_t> slow;
    for (std::size_t c = 0; c < m->size() && k < 400; ++c) {
      if (contains(m->cell(c).pieces[0], sphere::point_degrees(lambda, phi))) slow = c;
    }
    if (k < 400) CHECK(slow == found);
    inside += found ? 1 : 0;
  }
  CHECK(inside > 50);
}

TEST_CASE("only where its cover may end a mesh has a rim") {
  const auto global = regular(0, -90, 10, 10, 18, 36), band = regular(-180, -60, 10, 10, 12, 36),
             cap = regular(-180, 60, 10, 10, 3, 36), part = regular(0, -30, 10, 10, 6, 9),
             wedge = regular(0, -90, 10, 10, 18, 9), round = azimuthal_mesh({0, 90}, 4, 5, 1e5);
  const auto rim = [](const mesh::Mesh& m) {
    std::size_t count = 0;
    for (std::size_t k = 0; k < m.size(); ++k) count += m.on_rim(k) ? 1 : 0;
    return count;
  };
  CHECK(rim(*global) == 0);
  CHECK(rim(*band) == 2 * 36);
  CHECK(rim(*cap) == 36);
  CHECK(cap->on_rim(0));
  CHECK(rim(*part) == 2 * 9 + 2 * 4);
  CHECK(rim(*wedge) == 2 * 18);
  CHECK(rim(*round) == 14);
}

TEST_CASE("x runs east on a latitude-longitude grid and stands upright on the centre on every mesh") {
  const auto grid = regular(-180, -90, 7.5, 4.5, 40, 48), projected = azimuthal_mesh({-28, 48}, 6, 7, 50000, 2e6, -1e6),
             turned = rotated({even_edges(-20, 2, 20), even_edges(-20, 2, 20)}, kEurope);
  for (const auto& m : {grid, projected, turned}) {
    for (std::size_t k = 0; k < m->size(); ++k) {
      const auto x = m->x_direction(k);
      REQUIRE(x);
      CHECK(std::abs(norm(*x) - 1) < 1e-15);
      CHECK(std::abs(dot(*x, sphere::point(m->centre(k)))) < 1e-15);
    }
  }
  CHECK(norm(*grid->x_direction(5) - sphere::Vec3{-std::sin(grid->centre(5).longitude.radians()),
                                                  std::cos(grid->centre(5).longitude.radians()), 0}) < 1e-15);
  // On a rotated mesh x lies along the rotated parallel: it stands upright on the frame's pole too.
  const sphere::Vec3 pole = sphere::point_degrees(-162, 39.25);
  for (std::size_t k = 0; k < turned->size(); ++k) CHECK(std::abs(dot(*turned->x_direction(k), pole)) < 1e-15);
}

TEST_CASE("x of a projected mesh follows the projection on the ellipsoid too") {
  // Plate carree of geodetic latitudes: x runs east everywhere. Sinusoidal lines would not; Mercator's turned by 30
  // degrees, a conformal map, keeps the angle: x runs 30 degrees north of east.
  const Earth wgs84 = Earth::ellipsoid(6378137, 298.257223563);
  const double e = std::sqrt(wgs84.e2);
  const auto mercator = [e](std::vector<double>& x, std::vector<double>& y) {
    // Snyder 1987 (PP 1395) eqs (7-7), (7-9): the latitude from the isometric one by iteration.
    for (std::size_t k = 0; k < x.size(); ++k) {
      const double c = std::cos(std::numbers::pi / 6), s = std::sin(std::numbers::pi / 6);
      const double east = c * x[k] - s * y[k], north = s * x[k] + c * y[k];
      double sine = std::tanh(north);
      for (int step = 0; step < 40; ++step) sine = std::tanh(north + e * std::atanh(e * sine));
      x[k] = east * 180 / std::numbers::pi;
      y[k] = std::asin(sine) * 180 / std::numbers::pi;
    }
  };
  const auto m = mesh::make_projected(even_edges(0.5, 0.02, 5), even_edges(0.2, 0.02, 5), mercator, mercator, wgs84,
                                      "turned mercator", "test");
  for (std::size_t k = 0; k < m->size(); ++k) {
    const GeoPoint c = m->centre(k);
    const double lambda = c.longitude.radians(), phi = c.latitude.radians();
    const sphere::Vec3 east{-std::sin(lambda), std::cos(lambda), 0};
    const sphere::Vec3 north{-std::sin(phi) * std::cos(lambda), -std::sin(phi) * std::sin(lambda), std::cos(phi)};
    CHECK(dot(*m->x_direction(k), east) == doctest::Approx(std::cos(std::numbers::pi / 6)).epsilon(1e-8));
    CHECK(dot(*m->x_direction(k), north) == doctest::Approx(0.5).epsilon(1e-8));
  }
}

TEST_CASE("geodetic latitude undoes authalic latitude") {
  for (const double e2 : {0.0, 0.00669437999014, 0.1}) {
    for (double phi = -90; phi <= 90; phi += 3.7) {
      CHECK(std::abs(mesh::geodetic_latitude_deg(mesh::authalic_latitude_deg(phi, e2), e2) - phi) < 1e-13);
    }
    CHECK(mesh::geodetic_latitude_deg(90, e2) == 90);
  }
}

TEST_CASE("poles outside the globe are refused") {
  CHECK_THROWS_WITH_AS(
      rotated({{0, 1}, {0, 1}}, {10, 91, 0}),
      "rotated test: the rotated north pole at longitude 10, latitude 91 (north pole grid longitude 0) "
      "is no place on the globe",
      Error);
  CHECK_THROWS_AS(rotated({{0, 1}, {0, 1}}, {std::nan(""), 40, 0}), Error);
  CHECK_THROWS_AS(rotated({{0, 0}, {0, 1}}, kEurope), Error);
}
