// Shapes at a station: quantiles, deviation, wet-day frequency. No levels here.
#pragma once
#include "matching.h"
#include "windrow/adjust/transfer.h"

namespace windrow::adjust {

/// Fills target_shape and correction_shape from the samples and the calibration climate; fit's levels stand. False, and
/// both empty, when a season has no sample on one side.
bool add_shape(const Setup& setup, const RowClimate& climate, const Matched& matched, StationFit& fit);

/// Threshold that leaves a share `p` of the ascending sample at or above it, by the counts (k + 1/2) / (n + 1), but no
/// lower than wet_day / max_ratio: a day below could not become wet within the cap.
struct WetSplit {
  double threshold = 0;
  std::size_t below = 0;   ///< values of the sample below it
  std::size_t drawn = 0;   ///< wet days that are missing above it
  std::size_t excess = 0;  ///< values of wet_day or more below it
};
WetSplit split_wet(const Setup& setup, std::span<const double> ascending, double p);

/// Share of values at or above `wet_day` by the counts (k + 1/2) / (n + 1).
double wet_share(std::span<const double> ascending, double wet_day);

}  // namespace windrow::adjust
