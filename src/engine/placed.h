// A station's record with its place in the model. Private to the engine.
#pragma once
#include <cstdint>

#include "windrow/adjust/transfer.h"
#include "windrow/station/station.h"

namespace windrow::engine {

struct Placed {
  const station::Record* record = nullptr;
  std::uint32_t column = 0;  ///< of the model grid
  double model_height = 0;   ///< metres; with [field.terrain]
};

struct Fitted {
  const station::Record* record = nullptr;
  adjust::StationFit fit;
};

}  // namespace windrow::engine
