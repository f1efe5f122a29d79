// The correction of one place from what stations carry to it: the same for mesh cells and for stations left out. Where
// its series comes from is not known here.
#pragma once
#include <optional>
#include <span>
#include <vector>

#include "windrow/adjust/draws.h"
#include "windrow/adjust/transfer.h"
#include "windrow/pipeline/stage.h"

namespace windrow::pipeline {

/// Kept from place to place, so that its room is used again.
struct CellCorrection {
  adjust::Correction correction;
  std::optional<adjust::CellDraws> anchor_draws, run_draws;  ///< where days may be made wet
  std::vector<double> level, shape;                          ///< carried to the place
};

/// `row` of `adjust`'s reach maps, with the place's calibration climate and the anchor's reduced series there. False
/// when the place cannot be adjusted (beyond reach and told to be missing).
bool correct_cell(const AdjustInput& adjust, std::size_t row, const adjust::RowClimate& climate,
                  std::span<const double> anchor_series, CellCorrection& out);

}  // namespace windrow::pipeline
