#include "lanes.h"

#include "worker.h"

namespace windrow::pipeline {

WINDROW_CLONES
void finish_lanes(const linear_map::RowLanes& row, const FieldMath& field, double area, bool land_ok,
                  const BinnedSum::Bins& source_bins, const BinnedSum::Bins& stored_bins, LaneSums& sums,
                  LaneOutcome& out) {
  const double need = land_ok ? field.min_cover - kCoverTolerance : 2.0;  // cover never reaches 2
  double stored[kLanes];
  int kept_bits = 0, present_bits = 0, low_bits = 0, high_bits = 0;
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const double v = row.value[lane];
    const bool has = v == v;
    const bool keep = has && row.cover[lane] >= need;
    const double weighted = has ? v * (row.weight[lane] * area) : 0.0;
    const double in = keep ? weighted : 0.0, below = keep ? 0.0 : weighted;
    double high, low;
    source_bins.split(in, high, low);
    sums.high[kKept][lane] += high;
    sums.low[kKept][lane] += low;
    source_bins.split(below, high, low);
    sums.high[kBelow][lane] += high;
    sums.low[kBelow][lane] += low;
    double u = v * field.scale + field.offset;
    const bool is_low = keep && field.has_range && u < field.low, is_high = keep && field.has_range && u > field.high;
    u = is_low ? field.low : is_high ? field.high : u;
    const auto f = static_cast<float>(u);
    stored[lane] = keep ? static_cast<double>(f) * (row.weight[lane] * area) : 0.0;
    out.value[lane] = keep ? f : field.missing;
    kept_bits |= static_cast<int>(keep) << lane;
    present_bits |= static_cast<int>(has) << lane;
    low_bits |= static_cast<int>(is_low) << lane;
    high_bits |= static_cast<int>(is_high) << lane;
  }
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    double high, low;
    stored_bins.split(stored[lane], high, low);
    sums.high[kStored][lane] += high;
    sums.low[kStored][lane] += low;
  }
  out.kept = static_cast<std::uint32_t>(kept_bits);
  out.present = static_cast<std::uint32_t>(present_bits);
  out.low = static_cast<std::uint32_t>(low_bits);
  out.high = static_cast<std::uint32_t>(high_bits);
}

}  // namespace windrow::pipeline
