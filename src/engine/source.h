// Model fields on their own grids, fixed fields, and linear maps kept in the workspace. Private to the engine.
#pragma once
#include <map>
#include <memory>
#include <string>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/base/notices.h"
#include "windrow/cf/dataset.h"
#include "windrow/linear_map/linear_map.h"
#include "windrow/mesh/mesh.h"
#include "windrow/os/process.h"
#include "windrow/pipeline/stage.h"

namespace windrow::engine {

/// One variable of one run on its own grid.
struct Source {
  std::unique_ptr<cf::RunVariable> variable;
  mesh::MeshPtr mesh;
};
Source open_source(const std::vector<std::string>& files, const std::string& variable, const mesh::Earth& earth,
                   Notices& notices);

/// A field without time on its own grid, all cells; NaN where missing.
struct FixedField {
  mesh::MeshPtr mesh;
  std::vector<double> values;
  std::string variable, units;
};
/// The named variable, or with an empty name the file's only data variable (or the only one with `standard_name`).
/// Converted to `units`. Error(missing), Error(data).
FixedField read_fixed(const std::string& path, const std::string& standard_name, const std::string& units,
                      const mesh::Earth& earth, Notices& notices);

/// A raster or CF file of heights in metres on its own grid.
FixedField read_height(const std::string& path, const mesh::Earth& earth, Notices& notices);

/// Reads a run's variable for the pipeline.
class RunReader : public pipeline::SourceReader {
 public:
  explicit RunReader(const cf::RunVariable& variable) : variable_(variable) {}
  void read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const override {
    // A first pass over a long run takes longer than a user waits who asked to stop.
    if (os::stop_requested()) throw Error(Failure::interrupted, "", "interrupted; run again to go on from here");
    variable_.read(t0, t1, columns, out);
  }

 private:
  const cf::RunVariable& variable_;
};

using MapPtr = std::shared_ptr<const linear_map::LinearMap>;

/// Conservative maps by the digests of both meshes; in memory and in the workspace's folder `maps`.
class MapStore {
 public:
  explicit MapStore(std::string folder) : folder_(std::move(folder)) {}
  /// Built and stored when it is not there; an empty folder name keeps it in memory only.
  MapPtr conservative(const mesh::Mesh& source, const mesh::Mesh& target, linear_map::Quantity quantity);

 private:
  std::string folder_;
  std::map<std::string, MapPtr> held_;
};

/// A fixed field averaged conservatively onto the mesh; NaN where nothing covers a cell.
std::vector<double> onto_mesh(const FixedField& field, const mesh::Mesh& target, MapStore& maps);

}  // namespace windrow::engine
