// Laws of vectors carried by a map.
#include <doctest/doctest.h>

#include <cmath>

#include "shapeless.h"
#include "windrow/base/error.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/overlap/methods.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::LinearMap;
using sphere::Vec3;

namespace {

// A solid-body rotation about an axis tilted by 30 degrees (the test flow of Williamson et al. 1992, J. Comput. Phys.
// 102, 211, eqs 75 and 76, for alpha = 30 degrees): velocity is axis x position.
Vec3 velocity(const Vec3& position) {
  const Vec3 axis{-std::sin(30 * kDegree), 0, std::cos(30 * kDegree)};
  return cross(axis, position);
}

struct Components {
  std::vector<double> first, second;
};

Components along(const mesh::Mesh& grid, const overlap::Axes& axes) {
  Components out;
  for (std::size_t k = 0; k < grid.size(); ++k) {
    const Vec3 v = velocity(sphere::point(grid.centre(k)));
    out.first.push_back(dot(v, axes.first[k]));
    out.second.push_back(dot(v, axes.second[k]));
  }
  return out;
}

// Columns of a vector map from components along a source's axes.
std::vector<double> cartesian(const Components& c, const overlap::Axes& axes) {
  const std::size_t n = c.first.size();
  std::vector<double> out(3 * n);
  for (std::size_t k = 0; k < n; ++k) {
    const Vec3 v = c.first[k] * axes.first[k] + c.second[k] * axes.second[k];
    out[k] = v.x;
    out[n + k] = v.y;
    out[2 * n + k] = v.z;
  }
  return out;
}

std::vector<double> applied(const LinearMap& map, const std::vector<double>& columns) {
  const linear_map::Weights weights = linear_map::make_weights(map, {});
  linear_map::SourceBlock block;
  std::vector<std::uint32_t> all(columns.size());
  for (std::uint32_t k = 0; k < all.size(); ++k) all[k] = k;
  block.resize(all, columns.size(), 1);
  block.fill(0, 1, columns.data());
  std::vector<double> out(map.rows());
  for (std::size_t r = 0; r < map.rows(); ++r) linear_map::apply_series(weights, r, block, {&out[r], 1});
  return out;
}

double worst(const std::vector<double>& a, const std::vector<double>& b) {
  double most = 0;
  for (std::size_t k = 0; k < a.size(); ++k) {
    if (a[k] == a[k]) most = std::max(most, std::abs(a[k] - b[k]));
  }
  return most;
}

// Largest error of the rotation's components at the target's centres, both ends in true components.
double rotation_error(const mesh::Mesh& source, const mesh::Mesh& target) {
  const LinearMap scalar = overlap::bilinear(source, target);
  const overlap::Axes from = overlap::true_axes(source), to = overlap::true_axes(target);
  const std::vector<double> columns = cartesian(along(source, from), from);
  const Components expected = along(target, to);
  return std::max(worst(applied(overlap::vector_map(scalar, to.first), columns), expected.first),
                  worst(applied(overlap::vector_map(scalar, to.second), columns), expected.second));
}

}  // namespace

TEST_CASE("a solid-body rotation stays the same rotation: exactly on one mesh, to second order between two") {
  const auto coarse = regular(0, -90, 4, 3, 60, 90), fine = regular(0, -90, 2, 1.5, 120, 180);
  CHECK(rotation_error(*coarse, *coarse) < 1e-12);
  const auto target = regular(0.7, -90, 3.7, 2.9, 62, 97);  // over both poles and the date line
  const double e1 = rotation_error(*coarse, *target), e2 = rotation_error(*fine, *target);
  CAPTURE(e1);
  CAPTURE(e2);
  CHECK(e1 < 1.2e-3);
  CHECK(e2 < 0.3 * e1);
  const auto polar = azimuthal_mesh({10, 90}, 30, 30, 100e3);
  const double p1 = rotation_error(*coarse, *polar), p2 = rotation_error(*fine, *polar);
  CAPTURE(p1);
  CAPTURE(p2);
  CHECK(p1 < 1.5e-3);
  CHECK(p2 < 0.3 * p1);
}

TEST_CASE("components along a rotated grid come out as true ones on the same cells") {
  const auto grid = mesh::make_rotated({even_edges(-20, 1, 40), even_edges(-25, 1, 50)}, {-162, 39.25, 0},
                                       mesh::Earth::sphere(kRadius_m), "rotated");
  const LinearMap scalar = overlap::nearest(*grid, *grid);
  const overlap::Axes own = overlap::grid_axes(*grid), east_north = overlap::true_axes(*grid);
  const std::vector<double> columns = cartesian(along(*grid, own), own);
  const Components expected = along(*grid, east_north);
  CHECK(worst(applied(overlap::vector_map(scalar, east_north.first), columns), expected.first) < 1e-12);
  CHECK(worst(applied(overlap::vector_map(scalar, east_north.second), columns), expected.second) < 1e-12);
  const Components turned = along(*grid, own);  // and back
  const std::vector<double> back = cartesian(expected, east_north);
  CHECK(worst(applied(overlap::vector_map(scalar, own.first), back), turned.first) < 1e-12);
  CHECK(worst(turned.first, expected.first) > 0.01);
}

TEST_CASE(
    "axes are unit tangents and right-handed, and the grid's own are east and north on a latitude-longitude grid") {
  const auto grid = regular(0, -90, 10, 10, 18, 36);
  const overlap::Axes axes = overlap::true_axes(*grid), own = overlap::grid_axes(*grid);
  for (std::size_t k = 0; k < grid->size(); ++k) {
    const Vec3 up = sphere::point(grid->centre(k));
    CHECK(std::abs(dot(axes.first[k], up)) < 1e-15);
    CHECK(norm(cross(axes.first[k], axes.second[k]) - up) < 1e-15);
    CHECK(norm(own.first[k] - axes.first[k]) < 1e-14);
    CHECK(norm(own.second[k] - axes.second[k]) < 1e-14);
  }
  CHECK_THROWS_WITH_AS(
      overlap::grid_axes(Shapeless({grid})),
      "cells without shape: has no direction of growing x, which vector components along the grid refer to", Error);
}

TEST_CASE("a vector map has the cover and weights of its scalar map, and increments along the axis") {
  LinearMap scalar;
  scalar.columns = 4;
  scalar.value_columns = 2;
  scalar.row_start = {0, 4};
  scalar.column = {0, 1, 2, 3};
  scalar.share = {0.25, 0.5, 0.125, 0.0625};
  scalar.row_area = {1};
  scalar.column_area = {2, 3};
  const Vec3 axis{0.6, 0, 0.8};
  const LinearMap map = overlap::vector_map(scalar, {axis});
  CHECK(map.columns == 12);
  CHECK(map.value_columns == 6);
  CHECK(map.column_area == std::vector<double>{2, 3, 2, 3, 2, 3});
  const linear_map::Weights weights = linear_map::make_weights(map, {});
  std::vector<std::uint32_t> all(12);
  for (std::uint32_t k = 0; k < 12; ++k) all[k] = k;
  // x, y, z of both cells, then increments.
  const std::vector<double> columns{1, 2, 5, 7, -3, 4, 0.5, 0.25, 9, 9, -1, 2};
  linear_map::SourceBlock block;
  block.resize(all, 12, 1);
  block.fill(0, 1, columns.data());
  linear_map::RowLanes lanes;
  linear_map::apply_row(weights, 0, block, 0, lanes);
  const double values = 0.25 * (0.6 * 1 + 0.8 * -3) + 0.5 * (0.6 * 2 + 0.8 * 4);
  const double increments = 0.125 * (0.6 * 0.5 + 0.8 * -1) + 0.0625 * (0.6 * 0.25 + 0.8 * 2);
  CHECK(lanes.value[0] == doctest::Approx((values + increments) / 0.75).epsilon(1e-14));
  CHECK(lanes.cover[0] == doctest::Approx(0.75).epsilon(1e-15));
  CHECK_THROWS_AS(overlap::vector_map(scalar, {}), Error);
}
