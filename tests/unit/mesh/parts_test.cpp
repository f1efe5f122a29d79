// Laws of inferred corners, of parts of meshes and of points.
#include <doctest/doctest.h>

#include <random>

#include "azimuthal.h"
#include "globe_meshes.h"
#include "windrow/base/error.h"

using namespace windrow;
using namespace windrow::test;
using mesh::CellCorners;
using mesh::Sides;

namespace {

constexpr double kPi = std::numbers::pi;

mesh::MeshPtr cells(const CellCorners& corners) {
  Notices notices;
  auto m = mesh::make_cells(corners, Sides::great_circles, {}, "cells", notices);
  CHECK(notices.list().empty());
  return m;
}

struct Centres {
  std::vector<double> lon, lat;
};
template <typename Place>
Centres centres(std::size_t ny, std::size_t nx, Place&& place) {
  Centres out;
  for (std::size_t j = 0; j < ny; ++j) {
    for (std::size_t i = 0; i < nx; ++i) {
      const auto [l, p] = place(static_cast<double>(j), static_cast<double>(i));
      out.lon.push_back(l);
      out.lat.push_back(p);
    }
  }
  return out;
}
CellCorners inferred(const Centres& c, std::size_t ny, std::size_t nx) {
  return mesh::infer_corners(c.lon, c.lat, ny, nx, "grid");
}
std::string refusal(const Centres& c, std::size_t ny, std::size_t nx) {
  try {
    inferred(c, ny, nx);
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::data);
    return e.what();
  }
  return "no error";
}
std::size_t rim(const mesh::Mesh& m) {
  std::size_t count = 0;
  for (std::size_t k = 0; k < m.size(); ++k) count += m.on_rim(k) ? 1 : 0;
  return count;
}

}  // namespace

TEST_CASE("corners inferred on a tilted curvilinear grid are those it was made with") {
  // A rotated grid: its cells between rotated meridians and parallels are known.
  const mesh::Rotation europe{-162, 39.25, 0};
  const std::size_t ny = 40, nx = 50;
  const auto exact = mesh::make_rotated({even_edges(-10, 0.44, nx), even_edges(-8, 0.44, ny)}, europe, {}, "rotated");
  Centres c;
  for (std::size_t k = 0; k < exact->size(); ++k) {
    c.lon.push_back(exact->centre(k).longitude.degrees());
    c.lat.push_back(exact->centre(k).latitude.degrees());
  }
  const auto m = cells(inferred(c, ny, nx));
  CHECK(m->shape() == std::pair(ny, nx));
  CHECK(rim(*m) == 2 * (ny + nx) - 4);
  CHECK(std::abs(total_area(*m) / total_area(*exact) - 1) < 1e-4);
  for (std::size_t k = 0; k < m->size(); ++k) {
    CHECK(std::abs(m->area(k) / exact->area(k) - 1) < 1e-4);
    CHECK(m->find(exact->centre(k)) == k);
    CHECK(m->centre(k).longitude.degrees() == doctest::Approx(c.lon[k]).epsilon(1e-14));
    // Outermost corners go on along great circles, rows along parallels: h tan(8 degrees) = 1.1e-3 is their difference.
    const bool end_of_row = k % nx == 0 || k % nx == nx - 1;
    CHECK(norm(*m->x_direction(k) - *exact->x_direction(k)) < (end_of_row ? 1.1e-3 : 1e-4));
  }
}

TEST_CASE("inferred cells of a global grid close round and at the poles") {
  const auto c = centres(36, 72, [](double j, double i) { return std::pair(5 * i - 177.5, 5 * j - 87.5); });
  const auto m = cells(inferred(c, 36, 72));
  CHECK(std::abs(total_area(*m) / (4 * kPi) - 1) < 1e-12);
  CHECK(unmatched_arcs(*m) == 0);
  CHECK(rim(*m) == 0);
  // The same turned against the geographic frame: nothing is special at the poles or the date line.
  Centres t = c;
  mesh::rotated_projector({-30, 20, 60})(t.lon, t.lat);
  const auto turned = cells(inferred(t, 36, 72));
  CHECK(std::abs(total_area(*turned) / (4 * kPi) - 1) < 1e-12);
  CHECK(unmatched_arcs(*turned) == 0);
}

TEST_CASE("inferred cells reach the poles where rows are not spaced to do so, or have their centres there") {
  const auto latitudes = mesh::gaussian_latitudes_deg(64);
  const auto gaussian = centres(
      64, 128, [&](double j, double i) { return std::pair(2.8125 * i, latitudes[static_cast<std::size_t>(j)]); });
  const auto at_poles = centres(37, 72, [](double j, double i) { return std::pair(5 * i, 5 * j - 90); });
  const auto m = cells(inferred(gaussian, 64, 128)), p = cells(inferred(at_poles, 37, 72));
  for (const auto& mesh : {m, p}) {
    CHECK(std::abs(total_area(*mesh) / (4 * kPi) - 1) < 1e-12);
    CHECK(rim(*mesh) == 0);
    CHECK(mesh->cell(3).pieces[0].loops[0].size() == 3);
  }
  CHECK(p->area(0) == doctest::Approx(5 * kPi / 180 * (1 - std::sin(87.5 * kPi / 180))).epsilon(1e-3));
  // A belt that ends two rows before the pole is not stretched to it.
  const auto belt = centres(32, 72, [](double j, double i) { return std::pair(5 * i, 5 * j - 77.5); });
  CHECK(rim(*cells(inferred(belt, 32, 72))) == 2 * 72);
}

TEST_CASE("inferred cells close along the line between two poles where rows fold") {
  // Elliptic coordinates on a plane that touches the globe at the north pole: x + i y = cosh(u + i v); u = 0 is the
  // line between the foci, beyond which v runs backwards.
  const std::size_t ny = 24, nx = 80;
  const double step = 2 * kPi / static_cast<double>(nx), scale = 0.25;
  const auto c = centres(ny, nx, [&](double j, double i) {
    const double u = (static_cast<double>(ny) - 0.5 - j) * step, v = (i + 0.5) * step;
    const double x = scale * std::cosh(u) * std::cos(v), y = scale * std::sinh(u) * std::sin(v);
    return std::pair(std::atan2(y, x) * 180 / kPi, 90 - 2 * std::atan(0.5 * std::hypot(x, y)) * 180 / kPi);
  });
  const auto m = cells(inferred(c, ny, nx));
  CHECK(rim(*m) == nx);
  CHECK(unmatched_arcs(*m) == 2 * nx);  // each of the outer circle's, as it is and as it is not reversed
  for (std::size_t i = 0; i < nx; ++i) CHECK(m->on_rim(i));
  for (std::size_t k = 0; k < m->size(); ++k) {
    CHECK(m->find({Angle::degrees(c.lon[k]), Angle::degrees(c.lat[k])}) == k);
  }
  CHECK(m->find({Angle::degrees(90), Angle::degrees(90)}).has_value());
}

TEST_CASE("where neighbours are far apart, corners are not inferred") {
  const auto gap = centres(5, 12, [](double j, double i) { return std::pair(2 * i + (i > 5 ? 69 : 0), 2 * j - 4); });
  CHECK(refusal(gap, 5, 12) ==
        "grid: corners cannot be inferred: the centres at row 2, column 5 and row 2, column 6 (from 0) are 71 degrees "
        "apart (half of all neighbours: below 2)");
  const auto coarse = centres(3, 6, [](double j, double i) { return std::pair(30 * i, 10 * j - 10); });
  CHECK(refusal(coarse, 3, 6).find("are 30 degrees apart") != std::string::npos);
  const auto rows = centres(6, 5, [](double j, double i) { return std::pair(i, 0.5 * j + (j > 2 ? 3 : 0)); });
  CHECK(refusal(rows, 6, 5).find("row 2, column 0 and row 3, column 0 (from 0) are 3.5 degrees apart") !=
        std::string::npos);
  auto hole = centres(4, 4, [](double j, double i) { return std::pair(i, j); });
  hole.lon[6] = std::nan("");
  CHECK(refusal(hole, 4, 4).find("row 1, column 2 (from 0)") != std::string::npos);
  CHECK(refusal(centres(1, 4, [](double j, double i) { return std::pair(i, j); }), 1, 4) ==
        "grid: corners cannot be inferred from 1 x 4 centres, expected two along each axis");
}

TEST_CASE("a part of a mesh is its cells, with a rim where its cover may end") {
  const auto full = regular(-180, -90, 10, 10, 18, 36);
  std::vector<std::uint32_t> all, block, ring;
  for (std::uint32_t k = 0; k < full->size(); ++k) all.push_back(k);
  for (std::uint32_t j = 5; j < 10; ++j) {
    for (std::uint32_t i = 34; i < 40; ++i) block.push_back(j * 36 + i % 36);  // over the seam
  }
  for (std::uint32_t j = 0; j < 3; ++j) {
    for (std::uint32_t i = 0; i < 36; ++i) ring.push_back((2 - j) * 36 + i);
  }
  CHECK(rim(*mesh::make_subset(full, all)) == 0);
  CHECK(rim(*mesh::make_subset(full, block)) == 2 * 6 + 2 * 3);
  CHECK(rim(*mesh::make_subset(full, ring)) == 36);
  const auto part = mesh::make_subset(full, ring);
  CHECK(part->size() == ring.size());
  CHECK(part->shape() == std::pair<std::size_t, std::size_t>(1, ring.size()));
  CHECK(part->latlon() == nullptr);
  for (std::size_t k = 0; k < part->size(); ++k) {
    CHECK(part->area(k) == full->area(ring[k]));
    CHECK(part->perimeter(k) == full->perimeter(ring[k]));
    CHECK(part->find(full->centre(ring[k])) == k);
    CHECK(*part->x_direction(k) == *full->x_direction(ring[k]));
  }
  CHECK_FALSE(part->find(full->centre(300)));
  CHECK(part->digest() != full->digest());
  CHECK(part->digest() != mesh::make_subset(full, block)->digest());
  CHECK_THROWS_AS(mesh::make_subset(full, {0, 648}), Error);
}

TEST_CASE("a part of an unstructured mesh has the rim its own edges say") {
  const auto full = cells(corners_of(dual(icosahedral(3))));
  std::vector<std::uint32_t> north;
  for (std::uint32_t k = 0; k < full->size(); ++k) {
    if (full->centre(k).latitude.degrees() > 10) north.push_back(k);
  }
  const auto part = mesh::make_subset(full, north);
  std::size_t lone = 0;
  for (std::size_t k = 0; k < part->size(); ++k) {
    // A cell well within has all its neighbours; neighbours' centres are about 8 degrees apart.
    if (part->centre(k).latitude.degrees() > 20) CHECK_FALSE(part->on_rim(k));
    if (part->centre(k).latitude.degrees() < 13) CHECK(part->on_rim(k));
    lone += part->on_rim(k) ? 1 : 0;
  }
  CHECK(lone > 30);
  // Of a mesh that itself ends somewhere, what is on its rim stays there.
  const auto block = regular(0, 0, 1, 1, 5, 5);
  std::vector<std::uint32_t> same;
  for (std::uint32_t k = 0; k < 25; ++k) same.push_back(k);
  CHECK(rim(*mesh::make_subset(block, same)) == 16);
}

TEST_CASE("points have no area and are found in no cell") {
  const std::vector<GeoPoint> places = {{Angle::degrees(10), Angle::degrees(50)},
                                        {Angle::degrees(-70), Angle::degrees(0)}};
  const auto m = mesh::make_points(places, {});
  CHECK(m->size() == 2);
  CHECK_FALSE(m->has_area());
  CHECK(m->area(1) == 0);
  CHECK(m->cell(0).pieces.empty());
  CHECK(m->centre(1).longitude.degrees() == doctest::Approx(-70));
  CHECK_FALSE(m->find(places[0]));
  CHECK(m->on_rim(0));
  CHECK(m->describe() == "2 points");
  CHECK(m->digest() != mesh::make_points({places[1], places[0]}, {})->digest());
}
