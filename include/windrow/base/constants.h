// Physical constants, each with its source.
#pragma once

namespace windrow {

/// Authalic radius of WGS84 in metres: a·sqrt(q_p/2), Snyder 1987 (USGS PP 1395) eq. (3-13), computed from a and 1/f.
/// Used for cell areas in m2 when `earth = "sphere"` and no radius is given by the mesh's CRS.
inline constexpr double kEarthRadius_m = 6371007.1809;

/// Density of water for mass flux -> depth rate, kg m-3 (CF standard name table, lwe_* names: liquid water equivalent).
inline constexpr double kWaterDensity = 1000.0;

}  // namespace windrow
