// The axes of a CRS as PROJ tells them.
#pragma once
#include <string>
#include <vector>

#include "proj_handles.h"

namespace windrow::geo {

struct Axis {
  std::string direction, unit;
  double factor = 1;  ///< metres or radians per unit
};

/// The first two axes of a CRS's coordinate system; empty when PROJ does not tell.
std::vector<Axis> axes_of(PJ_CONTEXT* context, const PJ* crs);

}  // namespace windrow::geo
