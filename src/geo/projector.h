// Batched, thread-safe transformation between a CRS and longitude, latitude of its own geodetic base.
#pragma once
#include <memory>
#include <string>

#include "windrow/mesh/projector.h"

namespace windrow::geo {

/// How the base CRS's angles become degrees east of Greenwich.
struct BaseAngles {
  double degrees_per_unit = 1;    ///< 0.9 for a base in grads
  double prime_meridian_deg = 0;  ///< of the base, relative to Greenwich
};

struct ProjectorPair {
  mesh::Projector to_geographic, from_geographic;
};

/// Of a projected CRS; `definition` as create_crs takes it.
ProjectorPair make_projected_pair(const std::string& definition, const BaseAngles& angles, const std::string& place);
/// Of a geographic CRS: only units and prime meridian.
ProjectorPair make_geographic_pair(const BaseAngles& angles);

}  // namespace windrow::geo
