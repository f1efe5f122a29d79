// Meshes of extreme shape or scale: transects, relief, one cell for the globe, meshes much coarser than the source.
#include <doctest/doctest.h>

#include <cmath>

#include "kinds.h"
#include "windrow/overlap/overlap.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::LinearMap;
using linear_map::Quantity;

namespace {

Kind kind(std::string name, mesh::MeshPtr mesh, bool global = false) {
  Kind out{std::move(name), std::move(mesh), global, {}};
  set_bounds(out);
  return out;
}

mesh::MeshPtr projected(const Azimuthal& p, const std::vector<double>& x, const std::vector<double>& y) {
  return mesh::make_projected(
      x, y, [p](std::vector<double>& a, std::vector<double>& b) { p.to_geographic(a, b); },
      [p](std::vector<double>& a, std::vector<double>& b) { p.from_geographic(a, b); }, mesh::Earth::sphere(kRadius_m),
      "azimuthal equal-area", "test mesh");
}

// Largest residual of row and column sums, of the bound. What is wholly within the other mesh must add up to itself;
// `rows` and `columns` say whether everything is, otherwise sums may only fall short.
double sums(const LinearMap& map, const Kind& source, const Kind& target, bool rows, bool columns) {
  double worst = 0;
  for (std::size_t row = 0; row < map.rows(); ++row) {
    ExactSum sum;
    for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) sum.add(map.share[k]);
    const double off = sum.value() - 1;
    worst = std::max(worst, (rows ? std::abs(off) : off) / target.bound[row]);
  }
  const std::vector<double> overlap = linear_map::column_overlap(map);
  for (std::size_t c = 0; c < overlap.size(); ++c) {
    const double off = overlap[c] / source.mesh->area(c) - 1;
    worst = std::max(worst, (columns ? std::abs(off) : off) / source.bound[c]);
  }
  return worst;
}

// Both ways between a mesh and grids of which it is wholly a part: its rows close, then its columns do.
void check_within(const Kind& small, const std::vector<Kind>& around) {
  double worst = 0;
  for (const Kind& grid : around) {
    CAPTURE(grid.name);
    const auto onto = overlap::conservative(*grid.mesh, *small.mesh, Quantity::mean);
    const auto from = overlap::conservative(*small.mesh, *grid.mesh, Quantity::mean);
    CHECK(onto.closure.holds);
    CHECK(from.closure.holds);
    if (grid.global) CHECK(onto.closure.rows_checked == small.mesh->size());
    if (grid.global) CHECK(from.closure.columns_checked == small.mesh->size());
    const double here = std::max(sums(onto.map, grid, small, true, false), sums(from.map, small, grid, false, true));
    CHECK(here <= 1);
    worst = std::max(worst, here);
  }
  MESSAGE(small.name << ": sums off by " << worst << " of the bound");
}

std::vector<Kind> grids_around() {
  Notices notices;
  return {kind("1 degree", regular(-180, -90, 1, 1, 180, 360), true),
          kind("rotated", mesh::make_rotated({even_edges(-40, 0.9, 100), even_edges(-40, 0.9, 90)}, {-170, 40, 0},
                                             mesh::Earth::sphere(kRadius_m), "")),
          kind("triangles", mesh::make_faces(faces_of(icosahedral(4)), {}, "faces", notices), true),
          kind("reduced", reduced_gaussian(48), true), kind("HEALPix", healpix_of(3), true)};
}

}  // namespace

TEST_CASE("a transect of 2000 cells, each 2500 m long and 10 m wide, closes on every grid") {
  check_within(kind("transect", projected({12, 48}, even_edges(-2.5e6, 2500, 2000), {-5, 5})), grids_around());
}

TEST_CASE("relief of 100 x 100 cells of 10 m closes on every grid, also where four of its cells meet") {
  check_within(kind("relief", azimuthal_mesh({12, 48}, 100, 100, 10)), grids_around());
  check_within(kind("relief off centre", azimuthal_mesh({12, 48}, 100, 100, 10, 41234.5, -27654.3)), grids_around());
}

TEST_CASE("one cell for the whole globe, as mesh and as grid") {
  const Kind globe = kind("globe", regular(-180, -90, 360, 180, 1, 1), true);
  CHECK(globe.mesh->area(0) == doctest::Approx(4 * std::numbers::pi).epsilon(1e-15));
  for (Kind& other : source_kinds()) {
    CAPTURE(other.name);
    const auto onto = overlap::conservative(*other.mesh, *globe.mesh, Quantity::mean);
    const auto from = overlap::conservative(*globe.mesh, *other.mesh, Quantity::mean);
    CHECK(onto.closure.holds);
    CHECK(from.closure.holds);
    CHECK(from.closure.rows_checked == other.mesh->size());
    CHECK(onto.closure.columns_checked == other.mesh->size());
    CHECK(onto.map.pairings() == other.mesh->size());
    CHECK(from.map.pairings() == other.mesh->size());
    CHECK(sums(onto.map, other, globe, other.global, true) <= 1);
    CHECK(sums(from.map, globe, other, true, other.global) <= 1);
  }
}

TEST_CASE("a mesh much coarser than the source closes") {
  Notices notices;
  const std::vector<Kind> coarse{
      kind("HEALPix 0", healpix_of(0), true),
      kind("icosahedron", mesh::make_faces(faces_of(icosahedral(0)), {}, "f", notices), true),
      kind("cube", cells_from(corners_of(cubed(1))), true), kind("octants", regular(-180, -90, 90, 90, 2, 4), true)};
  const std::vector<Kind> fine{kind("1 degree", regular(-180, -90, 1, 1, 180, 360), true),
                               kind("reduced", reduced_gaussian(64), true),
                               kind("hexagons", cells_from(corners_of(dual(icosahedral(4)))), true)};
  double worst = 0;
  for (const Kind& target : coarse) {
    for (const Kind& source : fine) {
      CAPTURE(target.name);
      CAPTURE(source.name);
      const auto [map, closure] = overlap::conservative(*source.mesh, *target.mesh, Quantity::mean);
      CHECK(closure.holds);
      CHECK(closure.rows_checked == target.mesh->size());
      CHECK(closure.columns_checked == source.mesh->size());
      worst = std::max(worst, sums(map, source, target, true, true));
    }
  }
  MESSAGE("sums off by " << worst << " of the bound");
  CHECK(worst <= 1);
}

TEST_CASE("a coarse projected cell around a pole holds the fine cells there once") {
  // Parallels of the fine cells lie wholly within the coarse cell, far from its sides, which are not all convex.
  const Kind fine = kind("reduced", reduced_gaussian(48), true);
  for (const double phi : {-90.0, 90.0}) {
    const Kind around = kind("around a pole", azimuthal_mesh({10, phi}, 1, 1, 5000e3, 300e3, 200e3));
    const Kind split = kind("four about a pole", azimuthal_mesh({10, phi}, 2, 2, 2500e3, 300e3, 200e3));
    for (const Kind& coarse : {around, split}) {
      CAPTURE(coarse.name);
      const auto onto = overlap::conservative(*fine.mesh, *coarse.mesh, Quantity::mean);
      const auto from = overlap::conservative(*coarse.mesh, *fine.mesh, Quantity::mean);
      CHECK(sums(onto.map, fine, coarse, true, false) <= 1);
      CHECK(sums(from.map, coarse, fine, false, true) <= 1);
    }
  }
}
