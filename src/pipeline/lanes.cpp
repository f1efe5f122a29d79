#include "lanes.h"

#include <cstring>

namespace windrow::pipeline {

namespace {

// Four doubles side by side: one vector of the wider processors, two of the others. Comparisons give all-ones or all-zero
// lanes, `mask ? a : b` picks lane by lane. Always inlined: no vector crosses a call.
constexpr std::size_t kWide = 4;
using Wide = double __attribute__((vector_size(kWide * sizeof(double))));
using Floats = float __attribute__((vector_size(kWide * sizeof(float))));
#define WINDROW_INLINE inline __attribute__((always_inline))

WINDROW_INLINE void load(const double* from, Wide& out) { std::memcpy(&out, from, sizeof out); }

/// Two-bin split of the terms, added to their sums; see BinnedSum.
WINDROW_INLINE void add_term(double* high_sum, double* low_sum, const Wide& m1, const Wide& m2, const Wide& term) {
  Wide high_total, low_total;
  load(high_sum, high_total);
  load(low_sum, low_total);
  const Wide high = (term + m1) - m1;
  const Wide low = ((term - high) + m2) - m2;
  high_total += high;
  low_total += low;
  std::memcpy(high_sum, &high_total, sizeof high_total);
  std::memcpy(low_sum, &low_total, sizeof low_total);
}

/// Lanes at..at+3; returns how many are plain: kept and not clamped.
WINDROW_INLINE double finish_some(const linear_map::RowLanes& row, const FieldMath& field, double factor, double need,
                                  double least, double most, std::size_t at, LaneSums& sums, LaneOutcome& out) {
  const Wide zero = {}, one = zero + 1.0, low = zero + least, high = zero + most;
  Wide v, weight, cover, m1, m2;
  load(row.value.data() + at, v);
  load(row.weight.data() + at, weight);
  load(row.cover.data() + at, cover);
  load(sums.m1 + at, m1);
  load(sums.m2 + at, m2);
  weight *= factor;
  // A missing value is a NaN, which equals nothing.
  const Wide has = v == v ? one : zero;  // NOLINT(misc-redundant-expression)
  const Wide x = v == v ? v : zero;      // NOLINT(misc-redundant-expression)
  const Wide keep = cover >= zero + need ? has : zero;
  const Wide term = x * weight;
  add_term(sums.high[kKept] + at, sums.low[kKept] + at, m1, m2, keep * term);
  add_term(sums.high[kBelow] + at, sums.low[kBelow] + at, m1, m2, (one - keep) * term);
  const Wide u = x * field.scale + field.offset;
  const Wide raised = u < low ? low : u;
  const Wide ranged = raised > high ? high : raised;
  const Floats stored = __builtin_convertvector(ranged, Floats);
  const Wide back = (__builtin_convertvector(stored, Wide) - field.offset) * (1.0 / field.scale);
  add_term(sums.high[kStored] + at, sums.low[kStored] + at, m1, m2, keep * (back * weight));
  std::memcpy(out.value + at, &stored, sizeof stored);
  const Wide plain = ranged == u ? keep : zero;
  return (plain[0] + plain[1]) + (plain[2] + plain[3]);
}

/// Bits of what is not plain: missing, little cover, clamped. Rare, so lane by lane.
void sort_out(const linear_map::RowLanes& row, const FieldMath& field, double need, double low, double high,
              LaneOutcome& out) {
  out.kept = out.present = out.low = out.high = 0;
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const double v = row.value[lane], u = v * field.scale + field.offset;
    const bool has = v == v, keep = has && row.cover[lane] >= need;
    out.present |= (has ? 1U : 0U) << lane;
    out.kept |= (keep ? 1U : 0U) << lane;
    out.low |= (keep && u < low ? 1U : 0U) << lane;
    out.high |= (keep && u > high ? 1U : 0U) << lane;
  }
}

}  // namespace

WINDROW_CLONES
void finish_lanes(const linear_map::RowLanes& row, const FieldMath& field, double factor, double need, LaneSums& sums,
                  LaneOutcome& out) {
  const double low = field.has_range ? field.low : -1e300, high = field.has_range ? field.high : 1e300;
  double plain = 0;
  for (std::size_t at = 0; at < kLanes; at += kWide) {
    plain += finish_some(row, field, factor, need, low, high, at, sums, out);
  }
  out.kept = out.present = (1U << kLanes) - 1U;
  out.low = out.high = 0;
  if (plain == static_cast<double>(kLanes)) return;
  sort_out(row, field, need, low, high, out);
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    if ((out.kept >> lane & 1U) == 0) out.value[lane] = field.missing;
  }
}

}  // namespace windrow::pipeline
