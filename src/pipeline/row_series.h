// The whole regridded series of one mesh row, as columns need it. Private to the pipeline.
#pragma once
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "windrow/pipeline/stage.h"

namespace windrow::pipeline {

/// Everything of one row that its cells share; vectors run over the steps of the source block.
struct RowSeries {
  std::vector<double> weighted;              ///< value * present weight (source units), 0 where missing
  std::vector<double> reduced;               ///< output units, height-reduced; NaN where neither kept nor filled
  std::vector<std::uint8_t> kept, filled;
  std::uint64_t low_cover = 0;               ///< steps with a value but too little cover
};

/// `lapse_shift`: 12 monthly values subtracted (lapse * model height), empty without terrain; `month` of each step.
void make_row_series(const StageInput& input, std::size_t row, const linear_map::SourceBlock& source,
                     std::span<const double> lapse_shift, const std::vector<std::uint8_t>& month, RowSeries& out);

/// Bytes that decide a row's series: equal keys, equal bits.
std::string row_key(const StageInput& input, std::size_t row);

}  // namespace windrow::pipeline
