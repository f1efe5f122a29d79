#include "scan.h"

#include <algorithm>
#include <cmath>

#include "windrow/base/exact_sum.h"

namespace windrow::engine {
namespace {

// Columns whose overlap equals their own area within this are wholly inside the mesh; far above the rounding of the
// sums (1e-12 + 8 eps * perimeter / area) and far below any cell that is really cut.
constexpr double kWholeTolerance = 1e-9;

}  // namespace

bool Scan::mask_varies(std::size_t t0, std::size_t t1) const {
  for (std::size_t t = t0 + 1; t < t1; ++t) {
    if (mask_of_step[t] != mask_of_step[t0]) return true;
  }
  return false;
}

Scan scan_source(const pipeline::SourceReader& reader, const std::vector<std::uint32_t>& columns,
                 const std::vector<double>& column_weight, std::size_t steps) {
  Scan out;
  out.columns = columns;
  out.mask_of_step.resize(steps);
  out.largest.resize(steps);
  out.integral.resize(steps);
  out.absolute.resize(steps);
  double widest = 0;
  for (const auto c : columns) widest = std::max(widest, std::fabs(column_weight[c]));
  constexpr std::size_t kSliceBytes = 16 << 20;
  const std::size_t slice =
      std::max<std::size_t>(1, kSliceBytes / sizeof(double) / std::max<std::size_t>(1, columns.size()));
  std::vector<double> values;
  for (std::size_t t0 = 0; t0 < steps; t0 += slice) {
    const std::size_t count = std::min(slice, steps - t0);
    values.resize(count * columns.size());
    reader.read(columns, t0, t0 + count, values.data());
    for (std::size_t t = t0; t < t0 + count; ++t) {
      const double* row = values.data() + (t - t0) * columns.size();
      std::vector<bool> mask(columns.size());
      double largest = 0;
      for (std::size_t i = 0; i < columns.size(); ++i) {
        mask[i] = std::isnan(row[i]);
        if (!mask[i]) largest = std::max(largest, std::fabs(row[i]));
      }
      const auto bins = BinnedSum::bins(largest * widest * 2, columns.size() + 1);
      BinnedSum sum(bins), absolute(bins);
      for (std::size_t i = 0; i < columns.size(); ++i) {
        if (mask[i]) continue;
        const double term = row[i] * column_weight[columns[i]];
        sum.add(term);
        absolute.add(std::fabs(term));
      }
      out.largest[t] = largest;
      out.integral[t] = sum.value();
      out.absolute[t] = absolute.value();
      if (out.masks.empty() || out.masks.back() != mask) out.masks.push_back(std::move(mask));
      out.mask_of_step[t] = static_cast<std::uint32_t>(out.masks.size() - 1);
    }
  }
  return out;
}

std::vector<double> column_weights(const linear_map::LinearMap& map, const std::vector<double>& fraction) {
  auto out = linear_map::column_overlap(map);
  const std::size_t cells = map.value_columns;
  std::vector<bool> whole(cells);
  for (std::size_t c = 0; c < out.size(); ++c) {
    const double own = map.column_area[c % cells];
    if (c < cells) {
      whole[c] = std::fabs(out[c] - own) <= kWholeTolerance * own;
      if (whole[c]) out[c] = own;
    } else if (whole[c % cells] || !map.cover.empty()) {
      out[c] = 0;  // gradients about the centroid of a whole cell, and multipliers, move nothing in or out of it
    }
    if (map.quantity == linear_map::Quantity::total) out[c] /= own;
    if (!fraction.empty()) out[c] *= std::isnan(fraction[c % cells]) ? 0.0 : fraction[c % cells];
  }
  return out;
}

std::vector<float> cover_under(const linear_map::Weights& weights, const Scan& scan, std::uint32_t mask) {
  linear_map::SourceBlock block;
  block.resize(scan.columns, weights.map->columns, 1);
  std::vector<double> values(scan.columns.size());
  for (std::size_t i = 0; i < values.size(); ++i) values[i] = scan.masks[mask][i] ? std::nan("") : 1.0;
  block.fill(0, 1, values.data());
  std::vector<float> out(weights.map->rows());
  linear_map::RowLanes lanes;
  for (std::size_t row = 0; row < out.size(); ++row) {
    linear_map::apply_row(weights, row, block, 0, lanes);
    out[row] = static_cast<float>(std::min(1.0, lanes.cover[0]));
  }
  return out;
}

}  // namespace windrow::engine
