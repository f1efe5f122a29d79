// The mesh of the job: cells, how a product lays them out, earth, mask. Private to the engine.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/notices.h"
#include "windrow/cf/dataset.h"
#include "windrow/geo/crs.h"
#include "windrow/job/spec.h"
#include "windrow/mesh/mesh.h"

namespace windrow::engine {

class MapStore;

/// How a product's horizontal dimensions and coordinates describe the cells.
enum class MeshLayout {
  latlon,       ///< lat, lon axes
  projected,    ///< x, y axes of a CRS
  rotated,      ///< rlat, rlon axes of a rotated pole
  curvilinear,  ///< two dimensions, corners in 2-D bounds
  listed,       ///< one dimension, corners in bounds
  healpix,      ///< one dimension of cell numbers
  faces,        ///< UGRID
  catchments,   ///< CF polygon geometries
  towns         ///< CF discrete sampling points
};

struct Target {
  mesh::MeshPtr mesh;
  MeshLayout layout = MeshLayout::latlon;
  geo::Crs crs;  ///< of the projection, or the geographic one
  mesh::Earth earth;
  std::vector<double> x_edges, y_edges;  ///< of structured layouts: axis units, degrees on latlon and rotated ones
  std::size_t ny = 0, nx = 0;
  cf::Grid grid;                            ///< records behind rotated, curvilinear, listed, healpix and faces layouts
  std::vector<std::string> ids, names;      ///< catchments, towns
  std::vector<mesh::PolygonCell> polygons;  ///< catchments, geographic degrees
  std::vector<double> elevation;            ///< towns, metres; NaN: not given
  std::vector<bool> outside;                ///< one a cell: less than half within the mask; empty without a mask
  std::vector<Notice> notices;
};

/// Error(job) for a CRS that is not known or cells that do not exist there; Error(missing), Error(data) of the files a
/// mesh is read from.
Target make_target(const job::JobSpec& job, MapStore& maps);

/// Files a mesh is made from: products depend on them.
std::vector<std::string> mesh_files(const job::MeshSpec& spec);

}  // namespace windrow::engine
