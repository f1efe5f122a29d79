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

namespace {

// Pairings of a row that carry values come first: columns ascend, and increments are numbered behind the values.
std::vector<std::uint64_t> values_end(const LinearMap& map) {
  std::vector<std::uint64_t> out(map.rows());
  for (std::size_t row = 0; row < out.size(); ++row) {
    const auto first = map.column.begin() + static_cast<std::ptrdiff_t>(map.row_start[row]);
    const auto last = map.column.begin() + static_cast<std::ptrdiff_t>(map.row_start[row + 1]);
    out[row] = static_cast<std::uint64_t>(std::lower_bound(first, last, map.value_columns) - map.column.begin());
  }
  return out;
}

}  // namespace

Weights make_weights(const LinearMap& map, std::span<const double> fraction) {
  Weights out;
  out.map = &map;
  out.weight = map.share;
  out.cover = map.cover.empty() ? map.share : map.cover;
  const std::size_t rows = map.rows();
  if (map.columns > map.value_columns) out.values_end = values_end(map);
  out.row_fraction.assign(rows, 1.0);
  out.all_surface.assign(rows, 0);
  for (std::size_t row = 0; row < rows; ++row) {
    const auto first = map.row_start[row], last = map.row_start[row + 1];
    const auto end = out.values_end.empty() ? last : out.values_end[row];
    double shares = 0, weighted = 0;
    for (auto k = first; k < last; ++k) {
      const std::size_t cell = map.column[k] % map.value_columns;
      if (map.quantity == Quantity::total) out.cover[k] *= map.column_area[cell] / map.row_area[row];
      if (k >= end) out.cover[k] = 0;
      if (k < end) shares += map.share[k];
      if (fraction.empty()) continue;
      const double part = fraction[cell];
      out.weight[k] = std::isnan(part) ? 0.0 : map.share[k] * part;
      if (k < end) weighted += out.weight[k];
    }
    if (!fraction.empty()) out.row_fraction[row] = shares > 0 ? std::min(1.0, weighted / shares) : 0.0;
    if (!fraction.empty() && weighted == 0 && shares > 0) {
      out.all_surface[row] = 1;
      for (auto k = first; k < last; ++k) out.weight[k] = map.share[k];
    }
  }
  if (!map.factor.empty()) {
    out.multiplier = out.weight;
    for (std::size_t k = 0; k < out.multiplier.size(); ++k) out.multiplier[k] *= map.factor[k];
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

namespace {

// One pairing of a mean hands the source value on unchanged.
void apply_single(const Weights& weights, std::uint64_t k, const double* v, RowLanes& out) {
  const double w = weights.weight[k], share = std::min(1.0, weights.cover[k]);
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const double x = v[lane];
    out.value[lane] = x;
    out.cover[lane] = x == x ? share : 0.0;
    out.weight[lane] = x == x ? w : 0.0;
  }
}

// The value with the largest weight; of equal weights the lower value. Rows are short: a quadratic search is quickest.
void apply_categories(const Weights& weights, std::size_t row, const SourceBlock& source, const double* values,
                      RowLanes& out) {
  const LinearMap& map = *weights.map;
  const auto first = map.row_start[row], last = map.row_start[row + 1];
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const auto at = [&](std::uint64_t k) {
      return values[static_cast<std::size_t>(source.slot[map.column[k]]) * kLanes + lane];
    };
    double best = 0, present = 0, cover = 0, category = std::numeric_limits<double>::quiet_NaN();
    for (auto k = first; k < last; ++k) {
      const double x = at(k);
      if (x != x) continue;
      present += weights.weight[k];
      cover += weights.cover[k];
      double sum = 0;
      for (auto other = first; other < last; ++other) sum += at(other) == x ? weights.weight[other] : 0.0;
      if (sum > best || (sum == best && x < category)) {
        best = sum;
        category = x;
      }
    }
    out.value[lane] = category;
    out.cover[lane] = cover > 1.0 ? 1.0 : cover;
    out.weight[lane] = present;
  }
}

}  // namespace

WINDROW_CLONES void apply_row(const Weights& weights, std::size_t row, const SourceBlock& source, std::size_t block,
                              RowLanes& out) {
  const LinearMap& map = *weights.map;
  const double* values = source.value.data() + block * source.held * kLanes;
  const auto first = map.row_start[row], last = map.row_start[row + 1];
  const auto end = weights.values_end.empty() ? last : weights.values_end[row];
  const bool mean = map.quantity == Quantity::mean;
  const double* multiplier = weights.multiplier.empty() ? weights.weight.data() : weights.multiplier.data();
  if (weights.categories) return apply_categories(weights, row, source, values, out);
  if (mean && last - first == 1 && weights.multiplier.empty()) {
    return apply_single(weights, first, values + static_cast<std::size_t>(source.slot[map.column[first]]) * kLanes, out);
  }
  double sum[kLanes] = {}, present[kLanes] = {}, cover[kLanes] = {}, increment[kLanes] = {};
  for (auto k = first; k < end; ++k) {
    const double* v = values + static_cast<std::size_t>(source.slot[map.column[k]]) * kLanes;
    const double m = multiplier[k], w = weights.weight[k], share = weights.cover[k];
    for (std::size_t lane = 0; lane < kLanes; ++lane) {
      // A missing value is a NaN; it enters with weight zero. Adding zero changes no bit of the other terms.
      const double x = v[lane];
      const bool has = x == x;
      sum[lane] += has ? m * x : 0.0;
      present[lane] += has ? w : 0.0;
      cover[lane] += has ? share : 0.0;
    }
  }
  for (auto k = end; k < last; ++k) {
    const double* v = values + static_cast<std::size_t>(source.slot[map.column[k]]) * kLanes;
    for (std::size_t lane = 0; lane < kLanes; ++lane) increment[lane] += multiplier[k] * v[lane];
  }
  const bool separate = !map.cover.empty();  // increments of a map with its own cover are no part of the mean
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const double nan = std::numeric_limits<double>::quiet_NaN();
    double value = separate ? (mean ? sum[lane] / present[lane] : sum[lane]) + increment[lane]
                   : mean   ? (sum[lane] + increment[lane]) / present[lane]
                            : sum[lane] + increment[lane];
    value = value < weights.not_below ? weights.not_below : value;
    // A map with its own cover reaches beyond what overlaps a row: without any of that there is no value.
    out.value[lane] = present[lane] > 0 && (!separate || cover[lane] > 0) ? value : nan;
    out.cover[lane] = cover[lane] > 1.0 ? 1.0 : cover[lane];
    out.weight[lane] = !mean ? 1.0 : separate ? cover[lane] : present[lane];
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
