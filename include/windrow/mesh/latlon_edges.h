// The plain record of a latitude-longitude block, shared with readers that know no geometry.
#pragma once
#include <vector>

namespace windrow::mesh {

/// Extent of a structured latitude-longitude block: edges ascending, longitude edges spanning at most 360 degrees.
struct LatLonEdges {
  std::vector<double> lon_deg;  ///< nx + 1
  std::vector<double> lat_deg;  ///< ny + 1, within -90..90
};

/// Do the columns close on themselves? (first + 360) - first is not always 360 in floating point.
inline bool all_round(const LatLonEdges& edges) {
  return edges.lon_deg.back() - edges.lon_deg.front() > 360 - 1e-9;
}

}  // namespace windrow::mesh
