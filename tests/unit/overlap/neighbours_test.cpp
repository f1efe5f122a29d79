// Laws of centroids and of cells that touch.
#include <doctest/doctest.h>

#include <algorithm>
#include <numbers>
#include <set>

#include "overlap/contacts.h"
#include "shapeless.h"
#include "windrow/overlap/methods.h"

using namespace windrow;
using namespace windrow::test;
using sphere::Vec3;

namespace {

std::set<std::uint32_t> of(const overlap::Neighbours& n, std::size_t k) {
  return {n.cell.begin() + static_cast<std::ptrdiff_t>(n.start[k]),
          n.cell.begin() + static_cast<std::ptrdiff_t>(n.start[k + 1])};
}

bool symmetric(const overlap::Neighbours& n) {
  for (std::size_t k = 0; k + 1 < n.start.size(); ++k) {
    for (const std::uint32_t other : of(n, k)) {
      if (other == k || !of(n, other).count(static_cast<std::uint32_t>(k))) return false;
    }
  }
  return true;
}

void check_same(const overlap::Neighbours& a, const overlap::Neighbours& b) {
  CHECK(a.start == b.start);
  CHECK(a.cell == b.cell);
}

}  // namespace

TEST_CASE("geometry finds the neighbours that rows and columns tell") {
  for (const auto& grid : {regular(0, -90, 15, 10, 18, 24), regular(-20.3, 31.7, 1.1, 0.9, 7, 9),
                           regular(170, 60, 5, 5, 6, 5), azimuthal_mesh({10, 90}, 8, 9, 250e3)}) {
    CAPTURE(grid->describe());
    const overlap::Neighbours by_rows = overlap::neighbours(*grid);
    CHECK(symmetric(by_rows));
    check_same(by_rows, overlap::neighbours(Shapeless({grid})));
  }
}

TEST_CASE("cells touch across the date line and all round a pole") {
  const overlap::Neighbours n = overlap::neighbours(*regular(-180, -90, 30, 30, 6, 12));
  CHECK(of(n, 2 * 12) == std::set<std::uint32_t>{12, 13, 23, 25, 35, 36, 37, 47});
  CHECK(of(n, 5 * 12 + 3).size() == 11 + 3);  // the polar row and three below
  const overlap::Neighbours sides = overlap::side_neighbours(*regular(-180, -90, 30, 30, 6, 12));
  CHECK(of(sides, 2 * 12) == std::set<std::uint32_t>{12, 25, 35, 36});
  CHECK(of(sides, 5 * 12 + 3) == std::set<std::uint32_t>{51, 62, 64});
}

TEST_CASE("a curvilinear grid's seam and poles are found by geometry, the rest by rows and columns") {
  const auto grid = regular(-180, -90, 20, 15, 12, 18);
  check_same(overlap::neighbours(*grid), overlap::neighbours(*curvilinear(*grid)));
  const overlap::Neighbours by_sides = overlap::side_neighbours(*curvilinear(*grid));
  check_same(overlap::side_neighbours(*grid), by_sides);
}

TEST_CASE("HEALPix cells touch eight others, but seven where three base cells meet") {
  // Three of the twelve base cells meet at eight places (Gorski et al. 2005, ApJ 622, 759, fig. 3): 24 cells lie there.
  std::vector<mesh::HealpixCell> cells;
  for (std::uint64_t k = 0; k < 12 * 64; ++k) cells.push_back({3, k});
  const overlap::Neighbours n =
      overlap::neighbours(*mesh::make_healpix(cells, 0, mesh::Earth::sphere(kRadius_m), "healpix"));
  CHECK(symmetric(n));
  std::size_t seven = 0, eight = 0;
  for (std::size_t k = 0; k < cells.size(); ++k) {
    if (of(n, k).size() == 7) ++seven;
    if (of(n, k).size() == 8) ++eight;
  }
  CHECK(seven == 24);
  CHECK(eight == cells.size() - 24);
}

TEST_CASE("corners that hang on a side of a larger cell touch it") {
  const std::vector<std::size_t> count{4, 10, 16, 21, 16, 7, 3};
  const auto grid = reduced(count);
  const overlap::Neighbours n = overlap::neighbours(*grid);
  CHECK(symmetric(n));
  // Brute force: neighbours in rows next to each other have longitudes in common, end points included.
  std::vector<std::size_t> row;
  std::vector<std::pair<double, double>> range;
  for (std::size_t j = 0; j < count.size(); ++j) {
    for (std::size_t i = 0; i < count[j]; ++i) {
      row.push_back(j);
      const double width = 360.0 / static_cast<double>(count[j]);
      range.emplace_back(width * static_cast<double>(i), width * static_cast<double>(i + 1));
    }
  }
  for (std::size_t a = 0; a < row.size(); ++a) {
    std::set<std::uint32_t> expected;
    for (std::size_t b = 0; b < row.size(); ++b) {
      if (a == b || row[a] > row[b] + 1 || row[b] > row[a] + 1) continue;
      bool meets = row[a] == row[b] && (row[a] == 0 || row[a] + 1 == count.size());
      for (const double turn : {-360.0, 0.0, 360.0}) {
        meets = meets ||
                (range[a].first + turn <= range[b].second + 1e-9 && range[b].first <= range[a].second + turn + 1e-9);
      }
      if (meets) expected.insert(static_cast<std::uint32_t>(b));
    }
    CHECK(of(n, a) == expected);
  }
}

TEST_CASE("the centroid of a latitude-longitude cell is that of its closed form") {
  // Integral of x dA over a box of half width w about longitude 0: (sin w (phi + sin 2 phi / 2) between the latitudes,
  // 0, w sin^2 phi between them).
  const auto grid = regular(-15, -90, 30, 20, 9, 12);
  const overlap::Centroids c = overlap::centroids(*grid);
  for (std::size_t j = 0; j < 9; ++j) {
    const double south = (-90 + 20 * static_cast<double>(j)) * kDegree, north = south + 20 * kDegree;
    const double w = 15 * kDegree;
    const auto along = [&](double phi) { return std::sin(w) * (phi + 0.5 * std::sin(2 * phi)); };
    const auto up = [&](double phi) { return w * std::sin(phi) * std::sin(phi); };
    const Vec3 expected = sphere::unit(Vec3{along(north) - along(south), 0, up(north) - up(south)});
    CHECK(norm(c.direction[j * 12] - expected) < 1e-14);
  }
  for (std::size_t k = 0; k < grid->size(); ++k) {
    CHECK(std::abs(dot(c.first[k], c.direction[k])) < 1e-15);
    CHECK(norm(cross(c.direction[k], c.first[k]) - c.second[k]) < 1e-15);
    CHECK(std::abs(norm(c.first[k]) - 1) < 1e-15);
  }
}

TEST_CASE("a cell that holds the pole in its middle has its centroid there") {
  const auto grid = azimuthal_mesh({10, 90}, 5, 5, 500e3);
  const overlap::Centroids c = overlap::centroids(*grid);
  CHECK(norm(c.direction[12] - Vec3{0, 0, 1}) < 1e-13);
}
