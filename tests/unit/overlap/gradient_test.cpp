// Laws of the gradients that a linear reconstruction uses.
#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <numeric>
#include <random>

#include "shapeless.h"
#include "windrow/overlap/methods.h"
#include "windrow/sphere/area.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::Quantity;
using sphere::Vec3;

namespace {

const double kNan = std::numeric_limits<double>::quiet_NaN();

std::vector<double> all_columns(const linear_map::Extension& extension, const std::vector<double>& field) {
  std::vector<std::uint32_t> columns(extension.columns());
  std::iota(columns.begin(), columns.end(), 0U);
  const auto extender = extension.extender(columns);
  REQUIRE(extender->needs().size() == field.size());
  std::vector<double> out(columns.size());
  extender->extend(field, out);
  return out;
}

// Mean of a . x over each cell.
std::vector<double> means_of_linear(const mesh::Mesh& grid, const Vec3& a) {
  std::vector<double> out;
  for (std::size_t k = 0; k < grid.size(); ++k) {
    Vec3 sum;
    for (const sphere::Piece& piece : grid.cell(k).pieces) sum = sum + sphere::moment(piece, piece.loops[0][0].from);
    out.push_back(dot(a, sum) / grid.area(k));
  }
  return out;
}

// Largest error of the gradient of a . x away from the grid's rim, of |a|.
double worst_gradient(const mesh::Mesh& grid, std::size_t nx, const Vec3& a) {
  const std::vector<double> out =
      all_columns(*overlap::make_gradient(grid, Quantity::mean, false), means_of_linear(grid, a));
  const overlap::Centroids c = overlap::centroids(grid);
  const std::size_t n = grid.size();
  double worst = 0;
  for (std::size_t k = 0; k < n; ++k) {
    const std::size_t j = k / nx, i = k % nx;
    if (j == 0 || i == 0 || i + 1 == nx || k + nx >= n) continue;
    const double e1 = out[n + k] - dot(a, c.first[k]), e2 = out[2 * n + k] - dot(a, c.second[k]);
    worst = std::max(worst, std::hypot(e1, e2));
  }
  return worst / norm(a);
}

}  // namespace

TEST_CASE("gradients of linear fields are exact to second order on even cells") {
  const Vec3 a{0.3, -1.1, 0.7};
  const double coarse = worst_gradient(*azimuthal_mesh({10, 50}, 12, 12, 80e3), 12, a);
  const double fine = worst_gradient(*azimuthal_mesh({10, 50}, 24, 24, 40e3), 24, a);
  CAPTURE(coarse);
  CAPTURE(fine);
  CHECK(coarse < 3e-4);
  CHECK(fine < 0.30 * coarse);
}

TEST_CASE("gradients of linear fields are exact to first order on uneven cells, at the date line too") {
  const Vec3 a{-0.4, 0.9, 1.3};
  std::vector<double> errors;
  for (const std::size_t n : {12U, 24U}) {
    std::vector<double> lon{150}, lat{20};
    for (std::size_t k = 0; k < n; ++k) {
      const double step = 36.0 / static_cast<double>(n);
      lon.push_back(lon.back() + step * (k % 2 ? 1.3 : 0.7));
      lat.push_back(lat.back() + step * (k % 3 ? 1.1 : 0.8));
    }
    const auto grid = mesh::make_latlon({lon, lat}, mesh::Earth::sphere(kRadius_m), "uneven");
    errors.push_back(worst_gradient(*grid, n, a));
  }
  CAPTURE(errors[0]);
  CAPTURE(errors[1]);
  CHECK(errors[0] < 0.03);
  CHECK(errors[1] < 0.6 * errors[0]);
}

TEST_CASE("a constant has no gradient, and a field without neighbours none either") {
  const auto grid = regular(0, -90, 20, 20, 9, 18);
  const auto extension = overlap::make_gradient(*grid, Quantity::mean, true);
  std::vector<double> out = all_columns(*extension, std::vector<double>(grid->size(), 287.3));
  for (std::size_t k = grid->size(); k < out.size(); ++k) CHECK(out[k] == 0);
  std::vector<double> alone(grid->size(), kNan);
  alone[40] = 5;
  out = all_columns(*extension, alone);
  CHECK(out[40] == 5);
  CHECK(std::isnan(out[41]));
  for (std::size_t k = grid->size(); k < out.size(); ++k) CHECK(out[k] == 0);
}

TEST_CASE("neighbours in one line give the gradient along it only") {
  const auto grid = azimuthal_mesh({10, 0}, 5, 5, 10e3);  // x is east and y north in its middle
  const auto extension = overlap::make_gradient(*grid, Quantity::mean, false);
  const std::size_t n = grid->size();
  const double step = 10e3 / kRadius_m;
  for (const bool both : {false, true}) {
    std::vector<double> field(n, kNan);
    field[12] = 1;
    field[13] = 3;
    if (both) field[11] = -1;
    const std::vector<double> out = all_columns(*extension, field);
    CHECK(out[n + 12] == doctest::Approx(2 / step).epsilon(1e-4));
    CHECK(std::abs(out[2 * n + 12]) < 1e-3 * 2 / step);
  }
  // One neighbour at a corner: along the diagonal.
  std::vector<double> field(n, kNan);
  field[12] = 1;
  field[18] = 3;
  const std::vector<double> out = all_columns(*extension, field);
  CHECK(out[n + 12] == doctest::Approx(1 / step).epsilon(1e-3));
  CHECK(out[2 * n + 12] == doctest::Approx(1 / step).epsilon(1e-3));
}

TEST_CASE("a limited reconstruction makes no new extremes anywhere in a cell") {
  std::mt19937_64 random(20260301);
  std::normal_distribution<double> normal;
  std::uniform_real_distribution<double> uniform;
  for (const mesh::MeshPtr& grid :
       {regular(0, -90, 20, 15, 12, 18), azimuthal_mesh({0, 60}, 9, 9, 300e3), reduced({4, 10, 16, 21, 16, 7, 3})}) {
    CAPTURE(grid->describe());
    const std::size_t n = grid->size();
    const overlap::Centroids c = overlap::centroids(*grid);
    const overlap::Neighbours near = overlap::neighbours(*grid);
    const auto limited = overlap::make_gradient(*grid, Quantity::mean, true);
    const auto free = overlap::make_gradient(*grid, Quantity::mean, false);
    double beyond = 0, beyond_free = 0;
    for (int trial = 0; trial < 10; ++trial) {
      std::vector<double> field;
      for (std::size_t k = 0; k < n; ++k) field.push_back(uniform(random) < 0.15 ? kNan : normal(random));
      const std::vector<double> g = all_columns(*limited, field), unlimited = all_columns(*free, field);
      for (std::size_t k = 0; k < n; ++k) {
        if (std::isnan(field[k])) continue;
        double low = field[k], high = field[k];
        for (auto m = near.start[k]; m < near.start[k + 1]; ++m) {
          low = std::fmin(low, field[near.cell[m]]);
          high = std::fmax(high, field[near.cell[m]]);
        }
        for (const sphere::Piece& piece : grid->cell(k).pieces) {
          for (const sphere::Arc& arc : piece.loops[0]) {
            for (int s = 0; s <= 8; ++s) {
              const Vec3 p = sphere::point_on(arc, s / 8.0);
              const auto value = [&](const std::vector<double>& out) {
                return field[k] + out[n + k] * dot(p, c.first[k]) + out[2 * n + k] * dot(p, c.second[k]);
              };
              beyond = std::max({beyond, value(g) - high, low - value(g)});
              beyond_free = std::max({beyond_free, value(unlimited) - high, low - value(unlimited)});
            }
          }
        }
      }
    }
    CHECK(beyond < 1e-14);
    CHECK(beyond_free > 0.1);
  }
}

TEST_CASE("a total's gradient is that of its density, times the area") {
  const auto grid = regular(0, 30, 3, 2, 8, 9);
  std::mt19937_64 random(7);
  std::normal_distribution<double> normal;
  std::vector<double> density, total;
  for (std::size_t k = 0; k < grid->size(); ++k) {
    density.push_back(normal(random));
    total.push_back(density.back() * grid->area(k));
  }
  const std::vector<double> d = all_columns(*overlap::make_gradient(*grid, Quantity::mean, true), density);
  const std::vector<double> t = all_columns(*overlap::make_gradient(*grid, Quantity::total, true), total);
  for (std::size_t k = 0; k < grid->size(); ++k) {
    CHECK(t[k] == total[k]);
    for (const std::size_t part : {1U, 2U}) {
      CHECK(t[part * grid->size() + k] == doctest::Approx(d[part * grid->size() + k] * grid->area(k)).epsilon(1e-11));
    }
  }
}

TEST_CASE("the same columns of the same values give the same bits whatever else is asked for") {
  const auto grid = regular(0, -90, 20, 20, 9, 18);
  const std::size_t n = grid->size();
  std::mt19937_64 random(11);
  std::normal_distribution<double> normal;
  std::vector<double> field;
  for (std::size_t k = 0; k < n; ++k) field.push_back(k % 7 == 3 ? kNan : normal(random));
  const auto extension = overlap::make_gradient(*grid, Quantity::mean, true);
  const std::vector<double> all = all_columns(*extension, field);
  const std::vector<std::uint32_t> some{5,
                                        40,
                                        static_cast<std::uint32_t>(n + 40),
                                        static_cast<std::uint32_t>(n + 60),
                                        static_cast<std::uint32_t>(2 * n + 40),
                                        static_cast<std::uint32_t>(2 * n + 155)};
  const auto extender = extension->extender(some);
  CHECK(std::is_sorted(extender->needs().begin(), extender->needs().end()));
  CHECK(extender->needs().size() < n);
  std::vector<double> values, out(some.size());
  for (const std::uint32_t k : extender->needs()) values.push_back(field[k]);
  extender->extend(values, out);
  for (std::size_t k = 0; k < some.size(); ++k) {
    CHECK((out[k] == all[some[k]] || (std::isnan(out[k]) && std::isnan(all[some[k]]))));
  }
}

TEST_CASE("a limited linear map makes no new extremes, also in the mean over small cells, and keeps integrals") {
  std::mt19937_64 random(20260303);
  std::normal_distribution<double> normal;
  const auto source = regular(0, -90, 20, 15, 12, 18);
  const std::size_t n = source->size();
  const overlap::Neighbours near = overlap::neighbours(*source);
  const auto limited = overlap::make_gradient(*source, Quantity::mean, true);
  for (const mesh::MeshPtr& target : {regular(0.3, -90, 3.1, 2.9, 62, 116), azimuthal_mesh({10, 90}, 20, 20, 200e3)}) {
    CAPTURE(target->describe());
    const linear_map::LinearMap map = overlap::conservative_linear(*source, *target, Quantity::mean).map;
    REQUIRE(map.columns == 3 * n);
    double beyond = 0, off = 0, total = 0;
    for (int trial = 0; trial < 5; ++trial) {
      std::vector<double> field;
      for (std::size_t k = 0; k < n; ++k) field.push_back(normal(random));
      const std::vector<double> columns = all_columns(*limited, field);
      for (std::size_t r = 0; r < map.rows(); ++r) {
        double sum = 0, plain = 0, cover = 0, low = 1e9, high = -1e9;
        for (auto p = map.row_start[r]; p < map.row_start[r + 1]; ++p) {
          sum += map.share[p] * columns[map.column[p]];
          const std::size_t k = map.column[p];
          if (k >= n) continue;
          plain += map.share[p] * field[k];
          cover += map.share[p];
          low = std::min(low, field[k]);
          high = std::max(high, field[k]);
          for (auto m = near.start[k]; m < near.start[k + 1]; ++m) {
            low = std::min(low, field[near.cell[m]]);
            high = std::max(high, field[near.cell[m]]);
          }
        }
        beyond = std::max({beyond, sum / cover - high, low - sum / cover});
        off += map.row_area[r] * (sum - plain);
        total += map.row_area[r] * std::abs(sum);
      }
    }
    CHECK(beyond < 1e-13);
    if (target->latlon() != nullptr && target->on_rim(0) == false) CHECK(std::abs(off) < 1e-12 * total);
  }
}
