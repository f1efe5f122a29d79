// CF grid mappings (CF 1.13 appendix F) as PROJ strings. Rotated and geographic ones are in mapping_crs.cpp.
#pragma once
#include "mapping_attributes.h"

namespace windrow::geo {

/// "+proj=... ... +to_meter=..." without the earth's shape. `axis_metres`: metres per unit of the axes, which false
/// easting and northing are given in. Error(data): an attribute missing or out of range, or no such mapping.
std::string cf_projection(const MappingAttributes& attributes, double axis_metres);

/// Metres per radian of a geostationary scan angle: the perspective point's height.
double scan_height_m(const MappingAttributes& attributes);

}  // namespace windrow::geo
