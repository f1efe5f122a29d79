// Pointwise work on the kLanes steps of one row, for tiles. Private to the pipeline.
#pragma once
#include <cstdint>

#include "windrow/linear_map/kernel.h"
#include "windrow/pipeline/stage.h"

// See linear_map/kernel.cpp: same bits with wider vectors; off under sanitizers.
#if defined(__x86_64__) && defined(__GNUC__) && !defined(__clang__) && !defined(WINDROW_SANITIZED)
#define WINDROW_CLONES __attribute__((target_clones("avx2", "default")))
#else
#define WINDROW_CLONES
#endif

namespace windrow::pipeline {

using linear_map::kLanes;

/// Exact two-bin sums of kLanes steps, each with its own rounding constants.
struct LaneSums {
  double m1[kLanes] = {}, m2[kLanes] = {};
  double high[kIntegrals][kLanes] = {};
  double low[kIntegrals][kLanes] = {};
};

/// One row's outcome for kLanes steps.
struct LaneOutcome {
  float value[kLanes];       ///< stored value; the missing value where not kept
  std::uint32_t kept = 0;    ///< lanes that pass min_cover (and min_land)
  std::uint32_t present = 0; ///< lanes with any value
  std::uint32_t low = 0, high = 0;  ///< clamped lanes
};

/// Keeps or drops each lane, adds its integrals (value * weight * factor, see balance_factor), converts units, clamps to
/// the range and rounds to float32. `need`: least cover, see least_cover.
void finish_lanes(const linear_map::RowLanes& row, const FieldMath& field, double factor, double need, LaneSums& sums,
                  LaneOutcome& out);

}  // namespace windrow::pipeline
