// Polygons of real outlines: areas against an independent reference, neighbours that share a border as drawn.
#include <doctest/doctest.h>

#include <algorithm>
#include <array>
#include <fstream>
#include <map>
#include <set>
#include <sstream>
#include <tuple>

#include "windrow/mesh/mesh.h"

using namespace windrow;

namespace {

struct Counties {
  std::vector<mesh::PolygonCell> cells;
  std::vector<std::string> names;
};

Counties read_counties() {
  std::ifstream file(std::string(WINDROW_TESTDATA) + "/colorado/three_counties.csv");
  REQUIRE(file.good());
  Counties out;
  std::string line;
  std::getline(file, line);
  while (std::getline(file, line)) {
    std::replace(line.begin(), line.end(), ',', ' ');
    std::istringstream words(line);
    std::string name;
    double lon = 0, lat = 0;
    words >> name >> lon >> lat;
    if (out.names.empty() || out.names.back() != name) {
      out.names.push_back(name);
      out.cells.push_back({{{{}}}});
    }
    out.cells.back().parts[0][0].push_back({lon, lat});
  }
  return out;
}

}  // namespace

TEST_CASE("county areas on WGS84 are those of an equal-area projection") {
  const Counties counties = read_counties();
  const mesh::Earth wgs84 = mesh::Earth::ellipsoid(6378137, 298.257223563);
  const mesh::MeshPtr m = mesh::make_polygons(
      counties.cells, counties.names, [](std::vector<double>&, std::vector<double>&) {}, wgs84, "EPSG:4326", "test");
  // Made by tests/reference/polygon_areas.py: PROJ's ellipsoidal Lambert azimuthal equal-area projection, shapely; m2.
  const std::map<std::string, double> reference = {
      {"Grand", 4843037352.65}, {"Jackson", 4193433476.81}, {"Routt", 6137312442.58}};
  REQUIRE(m->size() == 3);
  for (std::size_t k = 0; k < m->size(); ++k) {
    CAPTURE(counties.names[k]);
    const double area_m2 = m->area(k) * wgs84.radius_m * wgs84.radius_m;
    CHECK(area_m2 == doctest::Approx(reference.at(counties.names[k])).epsilon(1e-10));
    CHECK(m->find(m->centre(k)) == k);
  }
}

TEST_CASE("counties share the arcs of their border to the bit") {
  const Counties counties = read_counties();
  const mesh::MeshPtr m = mesh::make_polygons(
      counties.cells, counties.names, [](std::vector<double>&, std::vector<double>&) {}, mesh::Earth{}, "EPSG:4326",
      "test");
  using Bits = std::array<double, 10>;
  std::array<std::set<Bits>, 3> arcs;
  for (std::size_t k = 0; k < 3; ++k) {
    const sphere::Polygon cell = m->cell(k);
    for (const sphere::Arc& whole : cell.pieces.front().loops.front()) {
      const sphere::Arc a = whole.dtheta > 0 ? whole : whole.reversed();
      arcs[k].insert(
          {a.from.x, a.from.y, a.from.z, a.to.x, a.to.y, a.to.z, a.circle.n.x, a.circle.n.y, a.circle.n.z, a.dtheta});
    }
  }
  // Sides that two outlines list alike, from the file itself.
  const auto sides = [&](std::size_t k) {
    std::set<std::array<double, 4>> out;
    const mesh::PolygonCell::Ring& ring = counties.cells[k].parts[0][0];
    for (std::size_t v = 0; v < ring.size(); ++v) {
      const auto &a = ring[v], &b = ring[(v + 1) % ring.size()];
      out.insert(a < b ? std::array{a[0], a[1], b[0], b[1]} : std::array{b[0], b[1], a[0], a[1]});
    }
    return out;
  };
  for (const auto& [p, q] : {std::pair(0, 1), std::pair(1, 2), std::pair(0, 2)}) {
    std::size_t as_drawn = 0, as_made = 0;
    for (const auto& side : sides(p)) as_drawn += sides(q).count(side);
    for (const Bits& bits : arcs[p]) as_made += arcs[q].count(bits);
    CHECK(as_drawn > 0);
    CHECK(as_made >= as_drawn);
  }
}
