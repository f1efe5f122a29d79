// From carried targets to the correction of one place.
#include "windrow/pipeline/cell.h"

namespace windrow::pipeline {
namespace {

/// out[i] = sum over the row's pairings of share * values[column * width + i].
void carry(const linear_map::LinearMap& map, std::size_t row, std::span<const double> values, std::size_t width,
           std::vector<double>& out) {
  out.assign(width, 0.0);
  for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
    const double share = map.share[k];
    const double* from = values.data() + static_cast<std::size_t>(map.column[k]) * width;
    for (std::size_t i = 0; i < width; ++i) out[i] += share * from[i];
  }
}

}  // namespace

bool correct_cell(const AdjustInput& adjust, std::size_t row, const adjust::RowClimate& climate,
                  std::span<const double> anchor_series, CellCorrection& out) {
  const std::size_t seasons = adjust.seasons();
  adjust::CellTarget target;
  target.fade_level = adjust.level->fade[row];
  if (adjust.missing_beyond) {
    if (target.fade_level <= 0) return false;
    target.fade_level = 1;
  }
  carry(adjust.level->map, row, adjust.station_level, seasons, out.level);
  for (std::size_t s = 0; s < adjust.drift_slope.size(); ++s) {
    out.level[s] += adjust.drift_slope[s] * adjust.drift_height[row];
  }
  target.level = out.level;
  target.mean_correction_level = adjust.mean_correction_level;
  if (adjust.setup.width() > 0) {
    carry(adjust.shape->map, row, adjust.station_shape, seasons * adjust.setup.width(), out.shape);
    target.shape = out.shape;
    target.mean_correction_shape = adjust.mean_correction_shape;
    target.fade_shape = adjust.shape->fade[row];
  }
  if (adjust.anchor_draws) {
    out.anchor_draws.emplace(*adjust.anchor_draws, adjust.cell_centre[row]);
    out.run_draws.emplace(*adjust.run_draws, adjust.cell_centre[row]);
  }
  adjust::make_correction(adjust.setup, adjust.anchor_steps, climate, anchor_series, target,
                          out.anchor_draws ? &*out.anchor_draws : nullptr, out.correction);
  return true;
}

}  // namespace windrow::pipeline
