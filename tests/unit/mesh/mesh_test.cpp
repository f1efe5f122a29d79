// Laws of meshes: areas add up to the sphere, polygons agree with closed forms, points find their cell.
#include <doctest/doctest.h>

#include <numbers>
#include <random>

#include "azimuthal.h"
#include "windrow/base/error.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using namespace windrow::test;
using mesh::Earth;

namespace {
constexpr double kPi = std::numbers::pi;

double radians(double degrees) { return degrees / 180 * kPi; }
GeoPoint at(double lambda, double phi) { return {Angle::degrees(lambda), Angle::degrees(phi)}; }

double total_area(const mesh::Mesh& m) {
  double sum = 0;
  for (std::size_t k = 0; k < m.size(); ++k) sum += m.area(k);
  return sum;
}
double total_polygon_area(const mesh::Mesh& m) {
  double sum = 0;
  for (std::size_t k = 0; k < m.size(); ++k) sum += sphere::area(m.cell(k));
  return sum;
}
}  // namespace

TEST_CASE("cells of a global grid add up to 4 pi, in closed form and as polygons") {
  std::vector<mesh::MeshPtr> grids = {regular(0, -90, 5, 5, 36, 72),        regular(-180, -90, 2.5, 2.5, 72, 144),
                                      regular(-1.25, -90, 2.5, 2, 90, 144), regular(0, -90, 360, 180, 1, 1),
                                      regular(-180, -90, 120, 180, 1, 3),   regular(10, -90, 180, 45, 4, 2),
                                      regular(0, -90, 3.6, 180, 1, 100),    regular(0.1, -90, 1.2, 1.5, 120, 300)};
  for (const std::size_t n : {32, 40, 64, 96}) {
    grids.push_back(
        mesh::make_latlon({even_edges(-0.9, 180.0 / static_cast<double>(n), 2 * n), mesh::gaussian_edges_deg(n)},
                          Earth::sphere(kRadius_m), "gaussian"));
  }
  grids.push_back(regular(0, -90, 5, 5, 36, 72, Earth::ellipsoid(6378137, 298.257223563)));
  for (const auto& grid : grids) {
    CAPTURE(grid->describe());
    CHECK(std::abs(total_area(*grid) / (4 * kPi) - 1) < 1e-12);
    CHECK(std::abs(total_polygon_area(*grid) / (4 * kPi) - 1) < 1e-12);
  }
}

TEST_CASE("cell areas on the ellipsoid are those of the closed form") {
  // Reference values computed apart from this code, a² dlambda (q2 - q1) / 2 on WGS84, 1 degree cells.
  const Earth earth = Earth::ellipsoid(6378137, 298.257223563);
  CHECK(earth.radius_m == doctest::Approx(6371007.1809).epsilon(1e-11));
  CHECK(earth.e2 == doctest::Approx(0.00669437999014).epsilon(1e-12));
  const auto grid = regular(0, -90, 1, 1, 180, 1, earth);
  const double r2 = earth.radius_m * earth.radius_m;
  CHECK(grid->area(90) * r2 == doctest::Approx(12308463894.0).epsilon(1e-10));
  CHECK(grid->area(150) * r2 == doctest::Approx(6123140878.7).epsilon(1e-11));
  CHECK(grid->area(179) * r2 == doctest::Approx(108866681.6).epsilon(1e-9));
}

TEST_CASE("authalic latitude: Snyder's example, odd, exact at the poles, without a step where its two forms meet") {
  // Snyder 1987 (PP 1395), eqs (3-11), (3-12), with the Clarke 1866 ellipsoid at 40 degrees: 39.8722878, computed apart
  // from this code (a transcription of the chapter says that its printed figure is wrong); likewise for WGS84.
  CHECK(mesh::authalic_latitude_deg(40, 0.00676866) == doctest::Approx(39.8722878).epsilon(2e-9));
  CHECK(mesh::authalic_latitude_deg(40, 0.00669437999014) == doctest::Approx(39.8736937).epsilon(2e-9));
  const double e2 = 0.00669437999014;
  CHECK(mesh::authalic_latitude_deg(90, e2) == 90);
  CHECK(mesh::authalic_latitude_deg(-33, e2) == -mesh::authalic_latitude_deg(33, e2));
  CHECK(mesh::authalic_latitude_deg(33, 0) == 33);
  const double below = mesh::authalic_latitude_deg(std::nextafter(45, 0), e2);
  CHECK(std::abs(mesh::authalic_latitude_deg(45, e2) - below) < 3e-14);
  // Close to the pole the colatitude shrinks by a fixed factor: dbeta/dphi = sqrt(2 / q_p) / sqrt(1 - e2).
  const double near = 90 - mesh::authalic_latitude_deg(90 - 1e-5, e2);
  const double nearer = 90 - mesh::authalic_latitude_deg(90 - 1e-6, e2);
  CHECK(near / nearer == doctest::Approx(10).epsilon(1e-7));
}

TEST_CASE("gaussian latitudes are the published ones and edges carry the weights") {
  // NCAR ds318.1 (40 latitudes; printed digits differ by up to 1e-4); CCCma (48).
  const auto r15 = mesh::gaussian_latitudes_deg(40);
  CHECK(std::abs(r15[39] - 86.5980) < 1.1e-4);
  CHECK(std::abs(r15[38] - 82.1909) < 1.1e-4);
  CHECK(std::abs(r15[36] - 73.3188) < 1.1e-4);
  CHECK(std::abs(r15[20] - 2.2220) < 1.1e-4);
  const auto cccma = mesh::gaussian_latitudes_deg(48);
  CHECK(std::abs(cccma[47] - 87.16) < 0.005);
  CHECK(std::abs(cccma[24] - 1.86) < 0.005);
  CHECK(mesh::is_gaussian(r15));
  auto shifted = r15;
  shifted[7] += 1e-3;
  CHECK_FALSE(mesh::is_gaussian(shifted));
  CHECK_FALSE(mesh::is_gaussian(even_edges(-87.5, 5, 35)));
  for (const std::size_t n : {2, 3, 5, 40, 96, 97}) {
    const auto edges = mesh::gaussian_edges_deg(n);
    const auto centres = mesh::gaussian_latitudes_deg(n);
    CAPTURE(n);
    CHECK(edges.front() == -90);
    CHECK(edges.back() == 90);
    // n weights integrate polynomials up to degree 2 n - 1 exactly: x² over -1..1 is 2/3.
    double second = 0;
    for (std::size_t k = 0; k < n; ++k) {
      CHECK(edges[k] < centres[k]);
      CHECK(centres[k] < edges[k + 1]);
      const double weight = std::sin(radians(edges[k + 1])) - std::sin(radians(edges[k]));
      second += weight * std::pow(std::sin(radians(centres[k])), 2);
      CHECK(edges[k] == -edges[n - k]);
    }
    CHECK(second == doctest::Approx(2.0 / 3).epsilon(1e-13));
  }
}

TEST_CASE("an equal-area mesh has equal areas on the sphere") {
  const std::vector<std::pair<Azimuthal, double>> places = {{{-28, 48}, 5000}, {{180, -17}, 5000},  {{40, 90}, 5000},
                                                            {{10, 50}, 25000}, {{10, -88}, 100000}, {{0, 0}, 500000}};
  for (const auto& place : places) {
    const auto& projection = place.first;
    const double size = place.second;
    const auto m = azimuthal_mesh(projection, 12, 16, size, 3 * size, -0.25 * size);
    const double expected = size * size / (kRadius_m * kRadius_m);
    double worst = 0;
    for (std::size_t k = 0; k < m->size(); ++k) {
      worst = std::max(worst, std::abs(m->area(k) / expected - 1));
      CHECK(sphere::area(m->cell(k)) == m->area(k));
    }
    INFO("cells of " << size << " m about latitude " << projection.phi1_deg);
    // Four edges, each within 1e-11 of its halves (whose own error is an eighth or less), and rounding of the corners.
    const double rounding = 8 * 2.2e-16 * 4 * kRadius_m / size;
    CHECK(worst < 4e-11 * 8 / 7 + rounding);
  }
}

TEST_CASE("splitting an edge makes area errors fall; unsplit 5 km edges are already exact") {
  const Azimuthal p{-28, 48};
  for (const double size : {5000.0, 25000.0, 1000000.0}) {
    const auto m = azimuthal_mesh(p, 3, 3, size, 1.5 * size, 2 * size);
    CAPTURE(size);
    const std::size_t arcs = m->cell(4).pieces[0].loops[0].size();
    if (size == 5000) CHECK(arcs == 4);
    if (size == 1000000) CHECK(arcs > 4);
  }
}

TEST_CASE("cells of some metres are taken, though their edges show the projection's rounding") {
  for (const double size : {10.0, 50.0, 200.0}) {
    const auto m = azimuthal_mesh({97, -61}, 6, 7, size, 100000, -40000);
    double worst = 0;
    for (std::size_t k = 0; k < m->size(); ++k) {
      worst = std::max(worst, std::abs(m->area(k) * kRadius_m * kRadius_m / (size * size) - 1));
    }
    CAPTURE(size);
    // Longitudes of 97 degrees come in steps of 1.6 nm on the ground, a few of which move each corner.
    CHECK(worst < 4 * 5e-9 / size + 1e-11);
  }
}

TEST_CASE("an edge that is no line on the globe is refused") {
  const auto torn = [](std::vector<double>& x, std::vector<double>& y) {
    for (std::size_t k = 0; k < x.size(); ++k) {
      y[k] = (x[k] < 2.3 ? 40 : 40.5) + y[k];
    }
  };
  CHECK_THROWS_WITH_AS(
      mesh::make_projected(even_edges(0, 1, 5), even_edges(0, 1, 4), torn, torn, Earth::sphere(kRadius_m), "torn", "m"),
      "m: the cell edge from x = 2, y = 0 to x = 3, y = 0 is no smooth line on the globe", Error);
}

TEST_CASE("neighbours share the very same arcs") {
  const auto m = azimuthal_mesh({30, 75}, 4, 5, 300000, 0, 500000);
  const auto shared = [&](std::size_t a, std::size_t b) {
    std::size_t count = 0;
    const sphere::Polygon one = m->cell(a), other = m->cell(b);
    for (const auto& x : one.pieces[0].loops[0]) {
      for (const auto& y : other.pieces[0].loops[0]) {
        if (x.from == y.to && x.to == y.from && x.circle == y.circle && x.dtheta == -y.dtheta) ++count;
      }
    }
    return count;
  };
  CHECK(shared(6, 7) >= 1);
  CHECK(shared(6, 11) >= 1);
  CHECK(shared(6, 13) == 0);
}

TEST_CASE("a mirrored projection gives the same areas, still with the interior on the left") {
  const Azimuthal p{-28, 48};
  const auto flip = [p](std::vector<double>& x, std::vector<double>& y) {
    for (double& v : x) v = -v;
    p.to_geographic(x, y);
  };
  const auto m = mesh::make_projected(even_edges(0, 5000, 4), even_edges(0, 5000, 3), flip, flip,
                                      Earth::sphere(kRadius_m), "mirrored", "test mesh");
  for (std::size_t k = 0; k < m->size(); ++k) {
    CHECK(m->area(k) == doctest::Approx(25e6 / kRadius_m / kRadius_m).epsilon(1e-10));
  }
}

TEST_CASE("points find the cell whose polygon holds them, on any turn of longitude") {
  std::mt19937_64 random(11);
  std::uniform_real_distribution<double> u(0, 1);
  const auto grid = regular(-180, -90, 7.5, 4.5, 40, 48);
  const auto mesh = azimuthal_mesh({180, 50}, 40, 50, 20000);
  std::size_t inside = 0;
  for (int k = 0; k < 3000; ++k) {
    const double lambda = 360 * u(random), phi = 180 * u(random) - 90;
    const auto found = grid->find(at(lambda, phi));
    REQUIRE(found);
    CHECK(grid->find(at(lambda - 360, phi)) == found);
    CHECK(sphere::contains(grid->cell(*found).pieces[0], sphere::point_degrees(lambda, phi)));
    const double l = 172 + 16 * u(random), p = 46 + 8 * u(random);
    const auto cell = mesh->find(at(l, p));
    CHECK(mesh->find(at(l - 360, p)) == cell);
    if (!cell) continue;
    ++inside;
    CHECK(sphere::contains(mesh->cell(*cell).pieces[0], sphere::point_degrees(l, p)));
  }
  CHECK(inside > 1000);
  for (std::size_t k = 0; k < mesh->size(); k += 7) CHECK(mesh->find(mesh->centre(k)) == k);
  CHECK_FALSE(mesh->find(at(0, -50)));
}

TEST_CASE("an edge belongs to the lower-numbered cell") {
  const auto grid = regular(0, -90, 10, 10, 18, 36);
  CHECK(grid->find(at(10, 5)) == 9 * 36 + 0);
  CHECK(grid->find(at(15, 0)) == 8 * 36 + 1);
  CHECK(grid->find(at(0, 5)) == 9 * 36 + 0);  // the seam: first and last column touch it
  CHECK(grid->find(at(-360, 5)) == 9 * 36 + 0);
  CHECK(grid->find(at(5, 90)) == 17 * 36 + 0);
  CHECK(grid->find(at(5, -90)) == 0);
  const auto part = regular(340, 40, 10, 10, 2, 4);  // 340 to 380
  CHECK(part->find(at(15, 45)) == 3);
  CHECK(part->find(at(-15, 55)) == 4);
  CHECK(part->find(at(20, 60)) == 7);
  CHECK_FALSE(part->find(at(25, 45)));
  CHECK_FALSE(part->find(at(0, 39)));
}

TEST_CASE("digests tell meshes apart and nothing else") {
  const auto a = regular(0, -90, 5, 5, 36, 72), b = regular(0, -90, 5, 5, 36, 72);
  CHECK(a->digest() == b->digest());
  CHECK(a->digest() != regular(0, -90, 5, 10, 18, 72)->digest());
  CHECK(a->digest() != regular(0, -90, 5, 5, 36, 72, Earth::ellipsoid(6378137, 298.25))->digest());
  CHECK(azimuthal_mesh({0, 48}, 2, 2, 5000)->digest() != azimuthal_mesh({0, 48}, 2, 2, 5001)->digest());
}

TEST_CASE("impossible grids are refused with their place and numbers") {
  const auto message = [](auto&& make) -> std::string {
    try {
      make();
    } catch (const Error& e) {
      CHECK(e.kind() == Failure::data);
      return e.what();
    }
    return "accepted";
  };
  const Earth earth = Earth::sphere(kRadius_m);
  CHECK(message([&] {
          return mesh::make_latlon({{0, 10, 10}, {0, 1}}, earth, "a.nc");
        }) == "a.nc: longitude edges must ascend strictly, but 10 is followed by 10");
  CHECK(message([&] {
          return mesh::make_latlon({{0, 10}, {80, 91}}, earth, "a.nc");
        }) == "a.nc: latitude edges reach from 80 to 91, expected -90 to 90");
  CHECK(message([&] {
          return mesh::make_latlon({{0, 200, 361}, {0, 1}}, earth, "a.nc");
        }) == "a.nc: longitude edges span 361 degrees, expected at most 360");
  CHECK(message([&] {
          return mesh::make_latlon({{0}, {0, 1}}, earth, "a.nc");
        }) == "a.nc: longitude edges: expected at least two");
  CHECK(message([&] {
          return azimuthal_mesh({0, 0}, 2, 2, 2e7);
        }) ==
        "test mesh: the mesh reaches beyond its projection: x = -20000000, y = -20000000 has no place on the globe");
}
