// Sampling a source at a target's centres: what the ways of finding weights have in common. Each way has a file of its
// own.
#pragma once
#include <memory>
#include <string>
#include <vector>

#include "centres.h"
#include "windrow/linear_map/linear_map.h"

namespace windrow::overlap {

struct Weight {
  std::uint32_t cell;
  double part;
};

/// A place to sample: as given, and its direction on the unit sphere.
struct Place {
  GeoPoint position;
  sphere::Vec3 direction;
};

/// Weights of source cells at a place. Const calls may run at the same time.
class Sampler {
 public:
  virtual ~Sampler() = default;
  /// `containing`: the source cell that holds the place. `out` comes empty; cells may come in any order and repeatedly.
  virtual void weigh(const Place& place, std::size_t containing, std::vector<Weight>& out) const = 0;
};

/// Between the rows and columns of a latitude-longitude grid, in its own coordinates.
std::unique_ptr<Sampler> rows_and_columns(const mesh::Mesh& source);
/// In the quadrilaterals of centres of any structured grid; in triangles where cells meet without them (folds, poles).
std::unique_ptr<Sampler> quadrilaterals(const mesh::Mesh& source);
/// In the Delaunay triangles of centres; beyond them the nearest point of the hull.
std::unique_ptr<Sampler> triangles(const mesh::Mesh& source);

/// A map of weights at all target centres that lie in a source cell: ascending columns, sums of 1.
linear_map::LinearMap sampled(const Sampler& sampler, const mesh::Mesh& source, const mesh::Mesh& target,
                              const std::string& method);

}  // namespace windrow::overlap
