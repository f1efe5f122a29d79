// Model fields on their own grids, fixed fields, and linear maps kept in the workspace. Private to the engine.
#pragma once
#include <memory>
#include <string>
#include <vector>

#include "grid_mesh.h"
#include "readers.h"
#include "regridding.h"
#include "windrow/base/notices.h"
#include "windrow/cf/dataset.h"
#include "windrow/geo/raster.h"
#include "windrow/mesh/mesh.h"

namespace windrow::engine {

/// One variable of one run on its own grid.
struct Source {
  std::unique_ptr<cf::RunVariable> variable;
  mesh::MeshPtr mesh;
};
Source open_source(const std::vector<std::string>& files, const std::string& variable, const mesh::Earth& earth,
                   Notices& notices, const cf::GridHints& hints = {});

/// A field without time on its own grid, all cells; NaN where missing.
struct FixedField {
  mesh::MeshPtr mesh;
  std::vector<double> values;
  std::string variable, units;
};
/// The named variable, or with an empty name the file's only data variable (or the only one with `standard_name`).
/// Converted to `units`. Error(missing), Error(data).
FixedField read_fixed(const std::string& path, const std::string& standard_name, const std::string& units,
                      const mesh::Earth& earth, Notices& notices, const cf::GridHints& hints = {});

/// A raster's own cells: of its CRS, or degrees where it names none.
GridMesh raster_mesh(const std::string& path, const geo::Raster& raster, const mesh::Earth& earth, Notices& notices);

/// A raster or CF file of heights in metres on its own grid.
FixedField read_height(const std::string& path, const mesh::Earth& earth, Notices& notices,
                       const cf::GridHints& hints = {});

/// A raster's or a CF file's numbers as they are: where they are neither zero nor missing, the mask is open.
FixedField read_mask(const std::string& path, const mesh::Earth& earth, Notices& notices);

/// A fixed field averaged conservatively onto the mesh; NaN where nothing covers a cell. `cover`, where given, takes
/// the share of each cell that has a value.
std::vector<double> onto_mesh(const FixedField& field, const mesh::Mesh& target, MapStore& maps,
                              std::vector<double>* cover = nullptr);

}  // namespace windrow::engine
