// Grids with exact means, maps applied to them, and the measures of Ullrich & Taylor 2015 (MWR,
// 10.1175/MWR-D-14-00343.1) of the results. What is asked of them is decided by the programs.
#pragma once
#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <limits>
#include <numeric>
#include <vector>

#include "exact_means.h"
#include "windrow/base/exact_sum.h"
#include "windrow/linear_map/extension.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/overlap/methods.h"

namespace windrow::test {

/// Values of the fields (of order 1) may leave a range by as much through rounding.
inline constexpr double kRounding = 1e-13;

using Fields = std::array<std::vector<double>, kFields>;

struct Grid {
  mesh::MeshPtr mesh;
  Fields mean;  ///< exact
  std::vector<Integral> integral;
};

/// Quadrature that every grid is given: the program checks it against a finer one.
inline ExactMeans usual_quadrature() { return ExactMeans(5, 0.03); }

inline Grid with_means(mesh::MeshPtr mesh, std::vector<Integral> integral) {
  Grid out{std::move(mesh), {}, std::move(integral)};
  for (std::size_t f = 0; f < kFields; ++f) {
    for (const Integral& cell : out.integral) out.mean[f].push_back(cell.field[f] / cell.area);
  }
  return out;
}

/// 2 rows columns; `shift` turns the columns by a part of their width.
inline mesh::MeshPtr latlon_mesh(int rows, double shift) {
  std::vector<double> lon, lat;
  const double step = 180.0 / rows;
  for (int k = 0; k <= 2 * rows; ++k) lon.push_back((k + shift) * step);
  for (int k = 0; k <= rows; ++k) lat.push_back(k == rows ? 90 : -90 + k * step);
  return mesh::make_latlon({lon, lat}, {}, "lat-lon");
}
inline Grid latlon_grid(int rows, double shift) {
  mesh::MeshPtr mesh = latlon_mesh(rows, shift);
  const mesh::LatLonEdges edges = *mesh->latlon();
  return with_means(std::move(mesh), usual_quadrature().latlon(edges.lon_deg, edges.lat_deg));
}

inline Grid healpix_grid(int level) {
  std::vector<mesh::HealpixCell> cells;
  for (std::uint64_t k = 0; k < std::uint64_t{12} << (2 * level); ++k) cells.push_back({level, k});
  return with_means(mesh::make_healpix(std::move(cells), 0, {}, "HEALPix"), usual_quadrature().healpix(level));
}

inline Grid loops_grid(const Loops& loops) {
  Notices notices;
  return with_means(mesh::make_cells(corners_of(loops), mesh::Sides::great_circles, {}, "loops", notices),
                    usual_quadrature().loops(loops));
}

/// Applies a map, with its extension or none, to every field. Results below `not_below` become it: part of the smooth
/// method for non-negative fields.
inline Fields apply(const linear_map::LinearMap& map, const linear_map::Extension* extension, const Fields& source,
                    double not_below = -std::numeric_limits<double>::infinity()) {
  std::vector<std::uint32_t> columns(map.columns);
  std::iota(columns.begin(), columns.end(), 0U);
  linear_map::SourceBlock block;
  block.resize(columns, map.columns, kFields);
  std::vector<double> values(map.columns);
  const auto extender = extension != nullptr ? extension->extender(columns) : nullptr;
  for (std::size_t f = 0; f < kFields; ++f) {
    if (extender != nullptr) {
      std::vector<double> needed;
      for (const std::uint32_t k : extender->needs()) needed.push_back(source[f][k]);
      extender->extend(needed, values);
    } else {
      values = source[f];
    }
    block.fill(f, 1, values.data());
  }
  linear_map::Weights weights = linear_map::make_weights(map, {});
  weights.not_below = not_below;
  Fields out;
  for (auto& field : out) field.resize(map.rows());
#pragma omp parallel for schedule(static)
  for (std::size_t row = 0; row < map.rows(); ++row) {
    std::array<double, kFields> series{};
    linear_map::apply_series(weights, row, block, series);
    for (std::size_t f = 0; f < kFields; ++f) out[f][row] = series[f];
  }
  return out;
}

/// Range, for each mesh cell, of the source cells that overlap it and of those that touch one of these.
struct Ranges {
  std::vector<double> lowest, highest;
};
inline Ranges ranges_near(const linear_map::LinearMap& plain, const overlap::Neighbours& near,
                          const std::vector<double>& source) {
  Ranges around{source, source};
  for (std::size_t k = 0; k < source.size(); ++k) {
    for (auto n = near.start[k]; n < near.start[k + 1]; ++n) {
      around.lowest[k] = std::min(around.lowest[k], source[near.cell[n]]);
      around.highest[k] = std::max(around.highest[k], source[near.cell[n]]);
    }
  }
  constexpr double infinite = std::numeric_limits<double>::infinity();
  Ranges out{std::vector<double>(plain.rows(), infinite), std::vector<double>(plain.rows(), -infinite)};
  for (std::size_t row = 0; row < plain.rows(); ++row) {
    for (auto p = plain.row_start[row]; p < plain.row_start[row + 1]; ++p) {
      out.lowest[row] = std::min(out.lowest[row], around.lowest[plain.column[p]]);
      out.highest[row] = std::max(out.highest[row], around.highest[plain.column[p]]);
    }
  }
  return out;
}

inline double most_beyond(const Ranges& ranges, const std::vector<double>& result) {
  double most = 0;
  for (std::size_t row = 0; row < result.size(); ++row) {
    most = std::max({most, ranges.lowest[row] - result[row], result[row] - ranges.highest[row]});
  }
  return most;
}

struct Measured {
  double l1 = 0, l2 = 0, most = 0;  ///< L1, L2, L infinity of the error, each relative to that of the exact means
  double under = 0, over = 0;       ///< Lmin, Lmax: beyond the source's extremes, relative to the exact means' range
  double beyond_all = 0, beyond_near = 0;  ///< largest excess over the source's range, over that near the cell
  double unbalanced = 0;                   ///< integral of the result against the source's, relative
};
/// `plain`: a map between the meshes with their areas.
inline Measured measured(const std::vector<double>& result, const std::vector<double>& exact,
                         const std::vector<double>& source, const linear_map::LinearMap& plain, const Ranges& ranges) {
  ExactSum e1, e2, f1, f2, after, before;
  Measured out;
  double largest = 0;
  const auto [low, high] = std::minmax_element(source.begin(), source.end());
  for (std::size_t row = 0; row < result.size(); ++row) {
    const double area = plain.row_area[row], error = std::abs(result[row] - exact[row]), f = std::abs(exact[row]);
    e1.add(area * error);
    e2.add(area * error * error);
    f1.add(area * f);
    f2.add(area * f * f);
    after.add(area * result[row]);
    out.most = std::max(out.most, error);
    largest = std::max(largest, f);
    out.under = std::max(out.under, *low - result[row]);
    out.over = std::max(out.over, result[row] - *high);
  }
  out.beyond_near = most_beyond(ranges, result);
  for (std::size_t k = 0; k < source.size(); ++k) before.add(plain.column_area[k] * source[k]);
  out.l1 = e1.value() / f1.value();
  out.l2 = std::sqrt(e2.value() / f2.value());
  out.most /= largest;
  out.beyond_all = std::max(out.under, out.over);
  const auto [least, greatest] = std::minmax_element(exact.begin(), exact.end());
  out.under /= *greatest - *least;
  out.over /= *greatest - *least;
  out.unbalanced = std::abs(after.value() - before.value()) / std::abs(before.value());
  return out;
}

}  // namespace windrow::test
