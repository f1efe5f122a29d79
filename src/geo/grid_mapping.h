// CF grid-mapping attributes (CF conventions, Appendix F) from what PROJ knows about a CRS.
#pragma once
#include "proj_handles.h"
#include "windrow/geo/crs.h"

namespace windrow::geo {

/// `axis_metres`: metres per unit of the projected axes (false easting is given in those units).
/// Ellipsoid and prime meridian are taken from `shape`.
struct Shape {
  double semi_major_m = 0, inverse_flattening = 0, prime_meridian_deg = 0;
};
GridMapping projected_mapping(PJ_CONTEXT* context, const PJ* crs, double axis_metres, const Shape& shape);
GridMapping geographic_mapping(const Shape& shape);

}  // namespace windrow::geo
