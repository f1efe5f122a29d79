// From a grid as a file describes it to cells on the globe. Private to the engine.
#pragma once
#include <optional>
#include <string>

#include "windrow/base/notices.h"
#include "windrow/cf/dataset.h"
#include "windrow/geo/crs.h"
#include "windrow/job/spec.h"
#include "windrow/mesh/mesh.h"

namespace windrow::engine {

struct GridMesh {
  mesh::MeshPtr mesh;
  std::optional<geo::Crs> crs;  ///< of a projected grid, in the file's axis units
};

/// Cells of any grid `cf` recognises; `earth` says how latitudes become those of the unit sphere. Error(data).
GridMesh mesh_of(const cf::Grid& grid, const mesh::Earth& earth, const std::string& place, Notices& notices);

/// A job's `grid = {...}` as the reader takes it.
cf::GridHints hints_of(const job::GridSpec& spec);

}  // namespace windrow::engine
