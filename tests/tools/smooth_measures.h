// Measures of the mass-preserving smooth method: integrals of source cells, sign, and how much of the steps between
// source cells is left. What is asked of them is decided by the program.
#pragma once
#include <algorithm>
#include <cmath>
#include <vector>

#include "measured.h"

namespace windrow::test {

/// Largest difference of a source cell's integral after mapping, relative to what it was; where that is less than a
/// millionth of the largest, relative to that millionth.
inline double worst_integral(const linear_map::LinearMap& plain, const std::vector<double>& result,
                             const std::vector<double>& source) {
  std::vector<ExactSum> sums(source.size());
  for (std::size_t row = 0; row < plain.rows(); ++row) {
    for (auto p = plain.row_start[row]; p < plain.row_start[row + 1]; ++p) {
      sums[plain.column[p]].add(plain.share[p] * plain.row_area[row] * result[row]);
    }
  }
  double largest = 0, worst = 0;
  for (const double v : source) largest = std::max(largest, std::abs(v));
  for (std::size_t k = 0; k < source.size(); ++k) {
    const double scale = plain.column_area[k] * std::max(std::abs(source[k]), 1e-6 * largest);
    worst = std::max(worst, std::abs(sums[k].value() - plain.column_area[k] * source[k]) / scale);
  }
  return worst;
}

/// Variance of the differences between mesh cells on either side of a source cell's border, weighted by the length of
/// their common side; mesh of 2 ny columns and ny rows all round the globe, source cells of `part` x `part` of them.
inline double variance_of_jumps(const std::vector<double>& value, std::size_t ny, std::size_t part) {
  const std::size_t nx = 2 * ny;
  double weights = 0, sum = 0, squares = 0;
  const auto add = [&](double weight, double jump) {
    weights += weight;
    sum += weight * jump;
    squares += weight * jump * jump;
  };
  const double step = std::numbers::pi / static_cast<double>(ny);
  for (std::size_t j = 0; j < ny; ++j) {
    for (std::size_t i = part - 1; i < nx; i += part) add(1, value[j * nx + (i + 1) % nx] - value[j * nx + i]);
  }
  for (std::size_t j = part - 1; j + 1 < ny; j += part) {
    const double length = std::cos(step * static_cast<double>(j + 1) - 0.5 * std::numbers::pi);
    for (std::size_t i = 0; i < nx; ++i) add(length, value[(j + 1) * nx + i] - value[j * nx + i]);
  }
  return squares / weights - (sum / weights) * (sum / weights);
}

struct SmoothMeasured {
  double integral = 0, integral_non_negative = 0;  ///< worst_integral of either variant
  double least_free = 0, least = 0;  ///< lowest value of non-negative fields, without and with the condition
  double jumps_gone = 0;             ///< share of the variance of jumps that is gone, against conservative-1; Y2
  double jumps_gone_exact = 0;       ///< the same of the exact means: what the field itself has no jumps of
  std::array<double, 3> l2{};        ///< L2 error of Y2: smooth, conservative-1, conservative-2
};

/// From a latitude-longitude grid of `rows` rows to one of `part` times as many, turned by `shift` of its cells. Jumps
/// are counted where source borders are the mesh's (shift 0).
inline SmoothMeasured measure_smooth(int rows, int part, double shift) {
  const Grid source = latlon_grid(rows, 0), target = latlon_grid(rows * part, shift);
  const auto mean = linear_map::Quantity::mean;
  const linear_map::LinearMap plain = overlap::conservative(*source.mesh, *target.mesh, mean).map;
  const linear_map::LinearMap linear = overlap::conservative_linear(*source.mesh, *target.mesh, mean).map;
  Fields fields = source.mean;  // Y2 is positive; the others are cut at their middle, which leaves areas of nothing
  for (double& v : fields[1]) v = std::max(0.0, v - 2);
  for (double& v : fields[2]) v = std::max(0.0, v - 1);
  SmoothMeasured out;
  Fields smooth;
  for (const bool non_negative : {false, true}) {
    const overlap::Smooth made = overlap::conservative_smooth(*source.mesh, *target.mesh, non_negative);
    const double not_below = non_negative ? 0 : -std::numeric_limits<double>::infinity();
    const Fields result = apply(made.map, made.extension.get(), fields, not_below);
    double& integral = non_negative ? out.integral_non_negative : out.integral;
    double& least = non_negative ? out.least : out.least_free;
    for (std::size_t f = 0; f < kFields; ++f) {
      integral = std::max(integral, worst_integral(plain, result[f], fields[f]));
      least = std::min(least, *std::min_element(result[f].begin(), result[f].end()));
    }
    if (non_negative) smooth = result;
  }
  const Fields first = apply(plain, nullptr, fields);
  const Fields second = apply(linear, overlap::make_gradient(*source.mesh, mean, true).get(), fields);
  const Ranges none{std::vector<double>(plain.rows()), std::vector<double>(plain.rows())};
  for (std::size_t k = 0; const Fields* result : std::array<const Fields*, 3>{&smooth, &first, &second}) {
    out.l2[k++] = measured((*result)[0], target.mean[0], fields[0], plain, none).l2;
  }
  if (shift == 0) {
    const auto jumps = [&](const std::vector<double>& value) {
      return variance_of_jumps(value, static_cast<std::size_t>(rows * part), static_cast<std::size_t>(part));
    };
    out.jumps_gone = 1 - jumps(smooth[0]) / jumps(first[0]);
    out.jumps_gone_exact = 1 - jumps(target.mean[0]) / jumps(first[0]);
  }
  return out;
}

}  // namespace windrow::test
