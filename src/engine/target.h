// The mesh of the job: cells, projection, earth, cell heights. Private to the engine.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/notices.h"
#include "windrow/geo/crs.h"
#include "windrow/job/spec.h"
#include "windrow/mesh/mesh.h"

namespace windrow::engine {

struct Target {
  mesh::MeshPtr mesh;
  bool projected = false;
  geo::Crs crs;                          ///< of the projection, or the geographic one of a latlon mesh
  mesh::Earth earth;
  std::vector<double> x_edges, y_edges;  ///< metres, or degrees on a latlon mesh
  std::size_t ny = 0, nx = 0;
};

/// Error(job) for a CRS that is not known or cells that do not exist there.
Target make_target(const job::MeshSpec& spec);

}  // namespace windrow::engine
