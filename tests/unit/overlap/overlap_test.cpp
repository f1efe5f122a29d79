// Laws of overlaps: they add up to the cells before anything is normalised, wherever the mesh lies.
#include <doctest/doctest.h>
#include <omp.h>

#include <numbers>
#include <random>

#include "../mesh/azimuthal.h"
#include "windrow/base/error.h"
#include "windrow/overlap/overlap.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::LinearMap;
using linear_map::Quantity;
using mesh::Earth;

namespace {

mesh::MeshPtr gaussian(std::size_t n, double west) {
  return mesh::make_latlon({even_edges(west, 180.0 / static_cast<double>(n), 2 * n), mesh::gaussian_edges_deg(n)},
                           Earth::sphere(kRadius_m), "gaussian");
}

double row_sum(const LinearMap& map, std::size_t row) {
  double sum = 0;
  for (std::uint64_t p = map.row_start[row]; p < map.row_start[row + 1]; ++p) sum += map.share[p];
  return sum;
}

void check_well_formed(const LinearMap& map, std::size_t rows, std::size_t columns) {
  REQUIRE(map.rows() == rows);
  CHECK(map.columns == columns);
  CHECK(map.column.size() == map.share.size());
  CHECK(map.row_start.back() == map.column.size());
  bool ascending = true, positive = true;
  for (std::size_t r = 0; r < rows; ++r) {
    for (std::uint64_t p = map.row_start[r]; p < map.row_start[r + 1]; ++p) {
      if (p > map.row_start[r] && map.column[p - 1] >= map.column[p]) ascending = false;
      if (!(map.share[p] > 0)) positive = false;
    }
  }
  CHECK(ascending);
  CHECK(positive);
}

/// Builds the map, checks its form and that every sum holds within its bound; returns it.
overlap::Result checked(const mesh::Mesh& source, const mesh::Mesh& target) {
  CAPTURE(source.describe());
  CAPTURE(target.describe());
  overlap::Result r = overlap::conservative(source, target, Quantity::mean);
  check_well_formed(r.map, target.size(), source.size());
  CAPTURE(r.closure.worst_row);
  CAPTURE(r.closure.worst_row_bound);
  CAPTURE(r.closure.worst_column);
  CAPTURE(r.closure.worst_column_bound);
  CHECK(r.closure.holds);
  CHECK(r.closure.worst_row <= r.closure.worst_row_bound);
  CHECK(r.closure.worst_column <= r.closure.worst_column_bound);
  return r;
}

}  // namespace

TEST_CASE("latitude-longitude grids: every row and column adds up, across turns of longitude") {
  const auto one_degree = regular(-180, -90, 1, 1, 180, 360);
  const auto t63 = gaussian(96, 0);
  auto r = checked(*t63, *one_degree);
  CHECK(r.closure.rows_checked == one_degree->size());
  CHECK(r.closure.columns_checked == t63->size());
  r = checked(*gaussian(96, -0.9375), *one_degree);
  CHECK(r.closure.rows_checked == one_degree->size());
  r = checked(*one_degree, *gaussian(96, -0.9375));
  CHECK(r.closure.columns_checked == one_degree->size());
  r = checked(*regular(0, -90, 360, 180, 1, 1), *one_degree);
  CHECK(r.map.pairings() == one_degree->size());
  r = checked(*one_degree, *regular(7.3, -90, 360, 180, 1, 1));
  CHECK(r.map.pairings() == one_degree->size());
  // (start + 360) - start is not 360 in floating point here: still a grid that closes on itself.
  const auto crooked = regular(0.1, -90, 1.2, 1.5, 120, 300);
  r = checked(*crooked, *one_degree);
  CHECK(r.closure.rows_checked == one_degree->size());
  CHECK(r.closure.columns_checked == crooked->size());
  r = checked(*one_degree, *crooked);
  CHECK(r.closure.columns_checked == one_degree->size());
  r = checked(*regular(-30, 30, 2, 2, 10, 20), *regular(350, 35, 0.3, 0.25, 20, 30));  // regional, source west of 0
  CHECK(r.closure.rows_checked == 30 * 20);
}

TEST_CASE("shares that can be worked out by hand") {
  // 10 degree cells over 20 degree sources, shifted: a half, a quarter and the sine rule.
  const auto source = regular(0, -20, 20, 20, 2, 18);
  auto r = checked(*source, *regular(10, -5, 20, 10, 1, 1));
  REQUIRE(r.map.pairings() == 4);
  CHECK(r.map.column == std::vector<std::uint32_t>{0, 1, 18, 19});
  for (const double share : r.map.share) CHECK(share == doctest::Approx(0.25).epsilon(1e-15));
  r = checked(*source, *regular(0, -10, 20, 30, 1, 1));  // sin 10 / (sin 20 + sin 10) from the southern source
  const double s10 = std::sin(10 * kDegree), s20 = std::sin(20 * kDegree);
  CHECK(r.map.share[0] == doctest::Approx(s10 / (s10 + s20)).epsilon(1e-15));
  CHECK(r.map.share[1] == doctest::Approx(s20 / (s10 + s20)).epsilon(1e-15));
  r = checked(*source, *regular(-15, 0, 20, 20, 1, 1));  // across the seam: 15 of 20 degrees in the last column
  CHECK(r.map.column == std::vector<std::uint32_t>{18, 35});
  CHECK(r.map.share[0] == doctest::Approx(0.25).epsilon(1e-15));
  CHECK(r.map.share[1] == doctest::Approx(0.75).epsilon(1e-15));
  // A square about a point of four sources on the equator: quarters by symmetry.
  r = checked(*source, *azimuthal_mesh({20, 0}, 1, 1, 300000));
  CHECK(r.map.column == std::vector<std::uint32_t>{0, 1, 18, 19});
  for (const double share : r.map.share) CHECK(share == doctest::Approx(0.25).epsilon(1e-11));
  // A square about the pole over four quadrants.
  r = checked(*regular(0, -90, 90, 180, 1, 4), *azimuthal_mesh({33, 90}, 1, 1, 5000));
  REQUIRE(r.map.pairings() == 4);
  for (const double share : r.map.share) CHECK(share == doctest::Approx(0.25).epsilon(1e-10));
}

TEST_CASE("equal-area meshes over regular grids: mid-latitudes, date line, equator, poles") {
  const std::vector<Azimuthal> places = {{-28, 48}, {180, 52}, {-179.9, -17}, {0, 0}, {12, 90}, {12, 89.97}, {0, -90}};
  const std::vector<mesh::MeshPtr> sources = {regular(0, -90, 1.25, 1.25, 144, 288), regular(-180, -90, 5, 5, 36, 72),
                                              gaussian(96, -0.9375), regular(0, -90, 120, 30, 6, 3),
                                              regular(-90, -90, 360, 180, 1, 1)};
  for (const Azimuthal& place : places) {
    const auto target = azimuthal_mesh(place, 60, 80, 5000);
    for (const auto& source : sources) {
      const auto r = checked(*source, *target);
      CHECK(r.closure.rows_checked == target->size());
      CAPTURE(place.lambda0_deg);
      CAPTURE(place.phi1_deg);
      double worst = 0;
      for (std::size_t k = 0; k < target->size(); ++k) worst = std::max(worst, std::abs(row_sum(r.map, k) - 1));
      CHECK(worst <= 1e-12 + 8 * 2.2204e-16 * 4 * kRadius_m / 5000);
      // Whatever lies in the mesh's area lies in some source cell: overlap = mesh area.
      double total = 0, area = 0;
      for (const double overlap : column_overlap(r.map)) total += overlap;
      for (const double a : r.map.row_area) area += a;
      CHECK(std::abs(total / area - 1) < 1e-12);
    }
  }
}

TEST_CASE("source cells inside the mesh are filled by it") {
  const auto target = azimuthal_mesh({-28, 48}, 60, 80, 5000);
  const auto r = checked(*regular(0, -90, 0.5, 0.5, 360, 720), *target);
  CHECK(r.closure.columns_checked > 10);
  // The pole as a corner of all inner source cells, 0.1 degrees high.
  const auto polar = checked(*regular(0, 80, 15, 0.1, 100, 24), *azimuthal_mesh({12, 90}, 60, 80, 5000));
  CHECK(polar.closure.columns_checked > 24);
}

TEST_CASE("coarse meshes with split edges, over fine and coarse sources") {
  for (const auto& [place, size] : std::vector<std::pair<Azimuthal, double>>{
           {{10, 50}, 25000}, {{100, 85}, 100000}, {{180, 0}, 500000}, {{10, -89}, 1000000}}) {
    const auto target = azimuthal_mesh(place, 7, 9, size);
    checked(*regular(0, -90, 1.25, 1.25, 144, 288), *target);
    checked(*regular(-180, -90, 5, 5, 36, 72), *target);
    checked(*regular(0, -90, 360, 180, 1, 1), *target);
    checked(*regular(0, -90, 180, 90, 2, 2), *target);
  }
}

TEST_CASE("a mesh that runs along the source's own lines: no slivers") {
  // Cylindrical equal-area mesh (Snyder 1987, eqs 10-1, 10-2): x along parallels, y along meridians; its edges lie on
  // the source's edges.
  const auto forward = [](std::vector<double>& x, std::vector<double>& y) {
    for (std::size_t k = 0; k < x.size(); ++k) {
      x[k] = x[k] / kRadius_m / kDegree;
      y[k] = std::asin(y[k] / kRadius_m) / kDegree;
    }
  };
  std::vector<double> x, y;
  for (int k = 0; k <= 40; ++k) x.push_back((-50 + 2.5 * k) * kDegree * kRadius_m);
  for (int k = 0; k <= 20; ++k) y.push_back(std::sin((10 + 2.5 * k) * kDegree) * kRadius_m);
  const auto target =
      mesh::make_projected(x, y, forward, forward, Earth::sphere(kRadius_m), "cylindrical equal-area", "test");
  const auto r = checked(*regular(-180, -90, 5, 5, 36, 72), *target);
  CHECK(r.map.pairings() == target->size());  // each 2.5 degree cell in one 5 degree source cell
  for (const double share : r.map.share) CHECK(std::abs(share - 1) < 1e-13);
  const auto fine = checked(*regular(-180, -90, 1.25, 1.25, 144, 288), *target);
  CHECK(fine.map.pairings() == 4 * target->size());
}

TEST_CASE("random places, sizes and turns: sums hold") {
  std::mt19937_64 random(31337);
  std::uniform_real_distribution<double> u(0, 1);
  for (int k = 0; k < 60; ++k) {
    const double phi = k % 3 == 0 ? 90 - std::pow(10, -3 + 4 * u(random)) : 180 * u(random) - 90;
    const double size = std::pow(10, 2 + 3.3 * u(random));
    const double width = 360 / std::floor(1 + 120 * u(random)), height = 180 / std::floor(1 + 60 * u(random));
    const auto nx = static_cast<std::size_t>(std::lround(360 / width));
    const auto ny = static_cast<std::size_t>(std::lround(180 / height));
    CAPTURE(k);
    const auto source = regular(-180 + 360 * u(random), -90, width, height, ny, nx);
    if (std::abs(source->latlon()->lat_deg.back() - 90) > 1e-9) continue;
    checked(*source, *azimuthal_mesh({360 * u(random), phi}, 12, 9, size, size * u(random), size * u(random)));
  }
}

TEST_CASE("the number of threads changes no bit") {
  const auto source = regular(0, -90, 1.25, 1.25, 144, 288);
  const auto before = omp_get_max_threads();
  std::vector<LinearMap> maps;
  for (const int threads : {1, 2, 3}) {
    omp_set_num_threads(threads);
    const auto target = azimuthal_mesh({-28, 48}, 120, 110, 5000);
    maps.push_back(overlap::conservative(*source, *target, Quantity::mean).map);
  }
  omp_set_num_threads(before);
  CHECK(maps[0] == maps[1]);
  CHECK(maps[0] == maps[2]);
}

TEST_CASE("totals are split in proportion to the source cell") {
  const auto source = regular(0, -90, 0.5, 0.5, 360, 720);
  const auto target = azimuthal_mesh({-28, 48}, 60, 80, 5000);
  const LinearMap mean = overlap::conservative(*source, *target, Quantity::mean).map;
  const LinearMap total = overlap::conservative(*source, *target, Quantity::total).map;
  CHECK(total.quantity == Quantity::total);
  CHECK(total.column == mean.column);
  double worst = 0;
  for (std::size_t r = 0; r < mean.rows(); ++r) {
    for (std::uint64_t p = mean.row_start[r]; p < mean.row_start[r + 1]; ++p) {
      const double expected = mean.share[p] * mean.row_area[r] / mean.column_area[mean.column[p]];
      worst = std::max(worst, std::abs(total.share[p] / expected - 1));
    }
  }
  CHECK(worst < 1e-15);
}

TEST_CASE("a mesh beyond the source's extent is covered in part") {
  const auto target = azimuthal_mesh({-28, 48}, 60, 80, 5000);
  const auto r = checked(*regular(-28, 40, 1.25, 1.25, 20, 20), *target);
  CHECK(r.closure.rows_checked > target->size() * 2 / 5);
  CHECK(r.closure.rows_checked < target->size() * 3 / 5);
  CHECK(row_sum(r.map, 0) == 0);
  double least = 1, most = 0;
  for (std::size_t k = 0; k < target->size(); ++k) {
    least = std::min(least, row_sum(r.map, k));
    most = std::max(most, row_sum(r.map, k));
  }
  CHECK(least == 0);
  CHECK(most == doctest::Approx(1).epsilon(1e-11));
}

TEST_CASE("the ellipsoid enters both grids alike") {
  const Earth wgs84 = Earth::ellipsoid(6378137, 298.257223563);
  const auto source = regular(0, -90, 1.25, 1.25, 144, 288, wgs84);
  const auto r = checked(*source, *regular(-180, -90, 1, 1, 180, 360, wgs84));
  CHECK(r.closure.columns_checked == source->size());
  const LinearMap other =
      overlap::conservative(*regular(0, -90, 1.25, 1.25, 144, 288), *regular(-180, -90, 1, 1, 180, 360), Quantity::mean)
          .map;
  CHECK(other.column == r.map.column);
  CHECK(other.share != r.map.share);
}

TEST_CASE("points take the source cell that contains them") {
  const auto source = regular(0, -60, 10, 10, 12, 36);
  const auto at = [](double lambda, double phi) { return GeoPoint{Angle::degrees(lambda), Angle::degrees(phi)}; };
  const LinearMap map = overlap::containing(*source, {at(5, 5), at(-5, 5), at(0, 80), at(725, -55)});
  CHECK(map.rows() == 4);
  CHECK(map.row_start == std::vector<std::uint64_t>{0, 1, 2, 2, 3});
  CHECK(map.column == std::vector<std::uint32_t>{6 * 36, 6 * 36 + 35, 0});
  CHECK(map.share == std::vector<double>{1, 1, 1});
}
