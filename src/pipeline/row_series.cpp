#include "row_series.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "worker.h"

namespace windrow::pipeline {

using linear_map::kLanes;

void make_row_series(const StageInput& input, std::size_t row, const linear_map::SourceBlock& source,
                     std::span<const double> lapse_shift, const std::vector<std::uint8_t>& month, RowSeries& out) {
  const std::size_t steps = source.steps;
  out.weighted.resize(steps);
  out.reduced.assign(steps, std::numeric_limits<double>::quiet_NaN());
  out.kept.assign(steps, 0);
  out.filled.assign(steps, 0);
  out.low_cover = 0;
  const double need = least_cover(input, row);
  linear_map::RowLanes lanes;
  for (std::size_t block = 0; block < source.blocks(); ++block) {
    linear_map::apply_row(*input.weights, row, source, block, lanes);
    const std::size_t t0 = block * kLanes, count = std::min(kLanes, steps - t0);
    for (std::size_t lane = 0; lane < count; ++lane) {
      const std::size_t t = t0 + lane;
      const double v = lanes.value[lane];
      const bool has = v == v;
      const bool keep = has && lanes.cover[lane] >= need;
      out.weighted[t] = has ? v * lanes.weight[lane] : 0.0;
      out.kept[t] = keep ? 1 : 0;
      if (keep) {
        out.reduced[t] = v;
        continue;
      }
      if (has) ++out.low_cover;
      if (need > 1.0 || input.fill.empty()) continue;
      out.reduced[t] = fill_value(input, row, source, t);
      out.filled[t] = std::isnan(out.reduced[t]) ? 0 : 1;
    }
  }
  for (double& x : out.reduced) x = x * input.field.scale + input.field.offset;
  if (lapse_shift.empty()) return;
  for (std::size_t t = 0; t < steps; ++t) out.reduced[t] -= lapse_shift[month[t]];
}

std::string row_key(const StageInput& input, std::size_t row) {
  const auto& weights = *input.weights;
  std::string key;
  const auto add = [&key](const void* data, std::size_t size) { key.append(static_cast<const char*>(data), size); };
  for (auto k = weights.map->row_start[row]; k < weights.map->row_start[row + 1]; ++k) {
    add(&weights.map->column[k], sizeof(std::uint32_t));
    add(&weights.weight[k], sizeof(double));
    add(&weights.cover[k], sizeof(double));
  }
  const bool land_ok = weights.row_fraction[row] >= input.field.min_land;
  add(&land_ok, sizeof land_ok);
  // Filled values come from the row's own nearest source cells.
  for (std::size_t k = 0; !input.fill.empty() && k < FillCandidates::kPerRow; ++k) {
    add(&input.fill.column[row * FillCandidates::kPerRow + k], sizeof(std::uint32_t));
  }
  return key;
}

}  // namespace windrow::pipeline
