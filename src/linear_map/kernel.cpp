#include "windrow/linear_map/kernel.h"

#include <algorithm>
#include <cmath>
#include <limits>

// Wider vectors where the processor has them; the results are the same bits, since lanes are independent and nothing is
// contracted or reassociated. Off under sanitizers: a thread-sanitized program with clones dies at start.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) && !defined(WINDROW_SANITIZED)
#define WINDROW_CLONES __attribute__((target_clones("avx2", "default")))
#else
#define WINDROW_CLONES
#endif

namespace windrow::linear_map {

Weights make_weights(const LinearMap& map, std::span<const double> fraction) {
  Weights out;
  out.map = &map;
  out.weight = map.share;
  out.cover = map.share;
  const std::size_t rows = map.rows();
  out.row_fraction.assign(rows, 1.0);
  out.all_surface.assign(rows, 0);
  for (std::size_t row = 0; row < rows; ++row) {
    const auto first = map.row_start[row], last = map.row_start[row + 1];
    double shares = 0, weighted = 0;
    for (auto k = first; k < last; ++k) {
      if (map.quantity == Quantity::total) out.cover[k] *= map.column_area[map.column[k]] / map.row_area[row];
      shares += map.share[k];
      if (fraction.empty()) continue;
      const double part = fraction[map.column[k]];
      out.weight[k] = std::isnan(part) ? 0.0 : map.share[k] * part;
      weighted += out.weight[k];
    }
    if (!fraction.empty()) out.row_fraction[row] = shares > 0 ? std::min(1.0, weighted / shares) : 0.0;
    if (!fraction.empty() && weighted == 0 && shares > 0) {
      out.all_surface[row] = 1;
      for (auto k = first; k < last; ++k) out.weight[k] = map.share[k];
    }
  }
  return out;
}

void SourceBlock::resize(const std::vector<std::uint32_t>& columns, std::size_t all_columns, std::size_t step_count) {
  held = columns.size();
  steps = step_count;
  slot.assign(all_columns, kNotHeld);
  for (std::size_t i = 0; i < columns.size(); ++i) slot[columns[i]] = static_cast<std::uint32_t>(i);
  value.assign(blocks() * held * kLanes, std::numeric_limits<double>::quiet_NaN());
}

void SourceBlock::fill(std::size_t t0, std::size_t count, const double* values) {
  for (std::size_t t = t0; t < t0 + count; ++t) {
    double* lane = value.data() + (t / kLanes) * held * kLanes + t % kLanes;
    const double* from = values + (t - t0) * held;
    for (std::size_t i = 0; i < held; ++i) lane[i * kLanes] = from[i];
  }
}

WINDROW_CLONES void apply_row(const Weights& weights, std::size_t row, const SourceBlock& source, std::size_t block,
                              RowLanes& out) {
  const LinearMap& map = *weights.map;
  const double* values = source.value.data() + block * source.held * kLanes;
  const auto first = map.row_start[row], last = map.row_start[row + 1];
  const bool mean = map.quantity == Quantity::mean;
  if (mean && last - first == 1) {
    const double* v = values + static_cast<std::size_t>(source.slot[map.column[first]]) * kLanes;
    const double w = weights.weight[first], share = std::min(1.0, weights.cover[first]);
    for (std::size_t lane = 0; lane < kLanes; ++lane) {
      const double x = v[lane];
      out.value[lane] = x;
      out.cover[lane] = x == x ? share : 0.0;
      out.weight[lane] = x == x ? w : 0.0;
    }
    return;
  }
  double sum[kLanes] = {}, present[kLanes] = {}, cover[kLanes] = {};
  for (auto k = first; k < last; ++k) {
    const double* v = values + static_cast<std::size_t>(source.slot[map.column[k]]) * kLanes;
    const double w = weights.weight[k], share = weights.cover[k];
    for (std::size_t lane = 0; lane < kLanes; ++lane) {
      // A missing value is a NaN; it enters with weight zero. Adding zero changes no bit of the other terms.
      const double x = v[lane];
      const bool has = x == x;
      sum[lane] += has ? w * x : 0.0;
      present[lane] += has ? w : 0.0;
      cover[lane] += has ? share : 0.0;
    }
  }
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const double nan = std::numeric_limits<double>::quiet_NaN();
    const double value = mean ? sum[lane] / present[lane] : sum[lane];
    out.value[lane] = present[lane] > 0 ? value : nan;
    out.cover[lane] = cover[lane] > 1.0 ? 1.0 : cover[lane];
    out.weight[lane] = mean ? present[lane] : 1.0;
  }
}

void apply_series(const Weights& weights, std::size_t row, const SourceBlock& source, std::span<double> series) {
  RowLanes lanes;
  for (std::size_t block = 0; block < source.blocks(); ++block) {
    apply_row(weights, row, source, block, lanes);
    const std::size_t t0 = block * kLanes, count = std::min(kLanes, source.steps - t0);
    std::copy_n(lanes.value.begin(), count, series.begin() + static_cast<std::ptrdiff_t>(t0));
  }
}

}  // namespace windrow::linear_map
