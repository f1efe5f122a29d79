// [field.terrain] lapse = "fit". Private to the engine.
#pragma once
#include <array>
#include <string>
#include <vector>

#include "placed.h"
#include "windrow/base/notices.h"

namespace windrow::engine {

/// Lapse of each calendar month in output units per metre: least squares with an intercept of (station - model) against
/// (station's elevation - model height), over the stations' monthly means (of the series, else normals) and the model's
/// means of all its steps in the month. What the model has between its own cells is no part of it. Error(data) with
/// fewer than 5 stations, or height differences spanning under 300 m.
std::array<double, 12> fit_lapse(const std::vector<Placed>& placed, const std::vector<std::vector<double>>& series,
                                 const adjust::Steps& steps, const std::string& place, Notices& notices);

}  // namespace windrow::engine
