#include "lanes.h"

#include "worker.h"

namespace windrow::pipeline {

namespace {
/// Two-bin split of one lane's term, added to the lane's sums; see BinnedSum.
inline void add_term(LaneSums& sums, Integral which, std::size_t lane, double term) {
  const double high = (term + sums.m1[lane]) - sums.m1[lane];
  const double low = ((term - high) + sums.m2[lane]) - sums.m2[lane];
  sums.high[which][lane] += high;
  sums.low[which][lane] += low;
}
}  // namespace

WINDROW_CLONES
void finish_lanes(const linear_map::RowLanes& row, const FieldMath& field, double area, bool land_ok, LaneSums& sums,
                  LaneOutcome& out) {
  const double need = land_ok ? field.min_cover - kCoverTolerance : 2.0;  // cover never reaches 2
  const double low = field.has_range ? field.low : -1e300, high = field.has_range ? field.high : 1e300;
  const double back = 1.0 / field.scale;
  int kept_bits = 0, present_bits = 0, low_bits = 0, high_bits = 0;
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const double v = row.value[lane], weight = row.weight[lane] * area;
    const bool has = v == v;
    const bool keep = has && row.cover[lane] >= need;
    const double term = has ? v * weight : 0.0;
    add_term(sums, kKept, lane, keep ? term : 0.0);
    add_term(sums, kBelow, lane, keep ? 0.0 : term);
    const double u = v * field.scale + field.offset;
    const bool is_low = keep && u < low, is_high = keep && u > high;
    const auto f = static_cast<float>(is_low ? low : is_high ? high : u);
    add_term(sums, kStored, lane, keep ? (static_cast<double>(f) - field.offset) * back * weight : 0.0);
    out.value[lane] = keep ? f : field.missing;
    kept_bits |= static_cast<int>(keep) << lane;
    present_bits |= static_cast<int>(has) << lane;
    low_bits |= static_cast<int>(is_low) << lane;
    high_bits |= static_cast<int>(is_high) << lane;
  }
  out.kept = static_cast<std::uint32_t>(kept_bits);
  out.present = static_cast<std::uint32_t>(present_bits);
  out.low = static_cast<std::uint32_t>(low_bits);
  out.high = static_cast<std::uint32_t>(high_bits);
}

}  // namespace windrow::pipeline
