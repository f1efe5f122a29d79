// From fitted stations to what is carried: values in a row, height drift, variogram, reach maps. Private to the engine.
#pragma once
#include "calibration.h"
#include "placed.h"

namespace windrow::engine {

/// Fills `out` with targets (or corrections) of all stations, their means, the drift and the reach maps.
void carry_over(const CalibrationNeeds& needs, const std::vector<Fitted>& fitted, Calibration& out, Notices& notices);

}  // namespace windrow::engine
