// Laws of the search index: it leaves no cell out, at poles and the date line either, and finds few others.
#include <doctest/doctest.h>

#include <algorithm>
#include <random>

#include "azimuthal.h"
#include "globe_meshes.h"
#include "windrow/mesh/index.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using namespace windrow::test;
using mesh::Box;
using mesh::Index;

namespace {

mesh::MeshPtr cells(const mesh::CellCorners& corners, mesh::Sides sides = mesh::Sides::great_circles) {
  Notices notices;
  return mesh::make_cells(corners, sides, {}, "cells", notices);
}

bool holds(const sphere::Polygon& polygon, const sphere::Vec3& p) {
  return std::any_of(polygon.pieces.begin(), polygon.pieces.end(),
                     [&](const sphere::Piece& piece) { return contains(piece, p); });
}

/// A cap around each pole, between them a belt of eight: cells that span most of what a box can get wrong.
mesh::MeshPtr caps_and_belt() {
  mesh::CellCorners out;
  out.most = 4;
  for (int k = 0; k < 4; ++k) {
    out.lon_deg.push_back(90 * k);
    out.lat_deg.push_back(30);
  }
  for (int k = 0; k < 4; ++k) {
    out.lon_deg.push_back(-90 * k);
    out.lat_deg.push_back(-30);
  }
  for (int k = 0; k < 8; ++k) {
    for (const double l : {45.0 * k, 45.0 * k + 45, 45.0 * k + 45, 45.0 * k}) out.lon_deg.push_back(l);
    for (const double p : {-30, -30, 30, 30}) out.lat_deg.push_back(p);
  }
  out.nx = 10;
  return cells(out, mesh::Sides::parallels);
}

std::vector<mesh::MeshPtr> meshes() {
  return {regular(-180, -90, 7.5, 4.5, 40, 48),
          regular(0, -90, 120, 180, 1, 3),
          regular(0, -90, 360, 180, 1, 1),
          regular(0, -90, 60, 45, 4, 6),
          azimuthal_mesh({180, 50}, 40, 50, 50000),
          azimuthal_mesh({0, 90}, 41, 41, 200000),
          azimuthal_mesh({40, -90}, 5, 5, 2000000),
          mesh::make_rotated({even_edges(-180, 5, 72), even_edges(-90, 5, 36)}, {-162, 39.25, 0}, {}, "rotated"),
          cells(corners_of(icosahedral(3))),
          cells(corners_of(icosahedral(0))),
          cells(corners_of(dual(icosahedral(3)))),
          cells(corners_of(cubed(1))),
          cells(corners_of(cubed(17))),
          caps_and_belt()};
}

}  // namespace

TEST_CASE("the index finds every cell that has a point in the box") {
  std::mt19937_64 random(21);
  std::uniform_real_distribution<double> u(-1, 1);
  const std::vector<sphere::Vec3> special = {{0, 0, 1}, {0, 0, -1}, {1, 0, 0}, {-1, 0, 0}, {0, 1, 0}, {0, -1, 0}};
  for (const auto& m : meshes()) {
    CAPTURE(m->describe());
    const Index index(*m);
    std::vector<sphere::Polygon> polygons;
    for (std::size_t k = 0; k < m->size(); ++k) polygons.push_back(m->cell(k));
    std::vector<std::uint32_t> found;
    std::size_t inside = 0;
    for (int round = 0; round < 150; ++round) {
      // Points near poles and axes, near the date line, on the mesh, and anywhere.
      sphere::Vec3 p = sphere::unit({u(random), u(random), u(random)});
      const double size = std::pow(10, 3 * u(random) - 4);
      if (round % 3 == 0) p = sphere::unit(special[static_cast<std::size_t>(round / 3) % 6] + size * p);
      if (round % 3 == 1) p = sphere::point(m->centre(static_cast<std::size_t>(random() % m->size())));
      if (round % 15 == 2) p = sphere::unit({-1, 1e-9 * p.y, p.z});
      Box box;
      box.add(p + size * sphere::Vec3{u(random), u(random), u(random)}, 0);
      box.add(p, 0);
      index.find(box, found);
      CHECK(std::is_sorted(found.begin(), found.end()));
      for (std::uint32_t k = 0; k < polygons.size(); ++k) {
        if (!holds(polygons[k], p)) continue;
        ++inside;
        CHECK(std::binary_search(found.begin(), found.end(), k));
      }
    }
    CHECK(inside >= 50);
  }
}

TEST_CASE("the index finds exactly the cells whose boxes meet, each once") {
  std::mt19937_64 random(4);
  std::uniform_real_distribution<double> u(-1, 1);
  const auto m = cells(corners_of(dual(icosahedral(4))));  // no hulls: boxes are those of the polygons
  const Index index(*m);
  std::vector<Box> boxes;
  for (std::size_t k = 0; k < m->size(); ++k) boxes.push_back(mesh::box_of(m->cell(k)));
  std::vector<std::uint32_t> found, expected;
  for (int round = 0; round < 300; ++round) {
    Box box;
    box.add(sphere::unit({u(random), u(random), u(random)}), std::pow(10, 3 * u(random) - 3));
    index.find(box, found);
    expected.clear();
    for (std::uint32_t k = 0; k < boxes.size(); ++k) {
      if (boxes[k].meets(box)) expected.push_back(k);
    }
    CHECK(found == expected);
  }
}

TEST_CASE("a box holds all of its region, and little more") {
  std::mt19937_64 random(6);
  std::uniform_real_distribution<double> u(-1, 1);
  for (const auto& m : meshes()) {
    CAPTURE(m->describe());
    for (int round = 0; round < 400; ++round) {
      const sphere::Vec3 p = sphere::unit({u(random), u(random), u(random)});
      const std::size_t k = static_cast<std::size_t>(random() % m->size());
      const sphere::Polygon polygon = m->cell(k);
      Box point;
      point.low = {std::nextafter(static_cast<float>(p.x), 2.0F), std::nextafter(static_cast<float>(p.y), 2.0F),
                   std::nextafter(static_cast<float>(p.z), 2.0F)};
      point.high = {std::nextafter(static_cast<float>(p.x), -2.0F), std::nextafter(static_cast<float>(p.y), -2.0F),
                    std::nextafter(static_cast<float>(p.z), -2.0F)};
      if (holds(polygon, p)) CHECK(mesh::box_of(polygon).meets(point));
    }
  }
  // A small cell's box is its corners' box to a thousandth.
  const auto small = azimuthal_mesh({30, 40}, 3, 3, 5000);
  const Box box = mesh::box_of(small->cell(4));
  for (std::size_t axis = 0; axis < 3; ++axis) {
    CHECK(static_cast<double>(box.high[axis]) - static_cast<double>(box.low[axis]) < 1.01 * 1.4143 * 5000 / kRadius_m);
  }
}

TEST_CASE("points have boxes too, and an empty box meets nothing") {
  std::vector<GeoPoint> places;
  for (int k = 0; k < 100; ++k) places.push_back({Angle::degrees(3.6 * k - 180), Angle::degrees(1.8 * k - 90)});
  const auto m = mesh::make_points(places, mesh::Earth::ellipsoid(6378137, 298.257223563));
  const Index index(*m);
  std::vector<std::uint32_t> found{7};
  index.find(Box{}, found);
  CHECK(found.empty());
  Box box;
  const double beta = mesh::authalic_latitude_deg(1.8 * 60 - 90, m->earth().e2);
  box.add(sphere::point_degrees(3.6 * 60 - 180, beta), 1e-6);
  index.find(box, found);
  CHECK(found == std::vector<std::uint32_t>{60});
  Index(*mesh::make_points({}, {})).find(box, found);
  CHECK(found.empty());
}
