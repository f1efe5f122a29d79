// Linear maps of every method, kept in memory and in the workspace. Private to the engine.
#pragma once
#include <functional>
#include <map>
#include <memory>
#include <string>

#include "windrow/job/spec.h"
#include "windrow/linear_map/extension.h"
#include "windrow/linear_map/linear_map.h"
#include "windrow/mesh/mesh.h"

namespace windrow::engine {

using MapPtr = std::shared_ptr<const linear_map::LinearMap>;

/// How a field reaches the mesh.
struct Regridding {
  MapPtr map;
  std::shared_ptr<const linear_map::Extension> extension;  ///< null: the map takes plain values
  bool categories = false;
  bool keeps_integrals = true;  ///< conservative methods
};

/// The job's word for a method, as products tell it.
const char* name_of(job::Method method);

/// Maps by the digests of both meshes and the method; in memory and in the workspace's folder `maps`.
class MapStore {
 public:
  explicit MapStore(std::string folder) : folder_(std::move(folder)) {}
  /// Built and stored when it is not there; an empty folder name keeps it in memory only.
  MapPtr conservative(const mesh::Mesh& source, const mesh::Mesh& target, linear_map::Quantity quantity);
  /// `non_negative`: conservative-smooth keeps values at or above zero. A target of points takes the value of the cell
  /// that contains the point for conservative methods. Error(data) when a method cannot work on these meshes.
  Regridding regrid(job::Method method, const mesh::Mesh& source, const mesh::Mesh& target,
                    linear_map::Quantity quantity, bool non_negative);

 private:
  MapPtr kept(const mesh::Mesh& source, const mesh::Mesh& target, const std::string& method,
              const std::function<linear_map::LinearMap()>& make);
  std::string folder_;
  std::map<std::string, MapPtr> held_;
};

}  // namespace windrow::engine
