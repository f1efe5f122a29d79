// What comes beside the overlap: gradients, smoothing, sampling at points, vectors.
#pragma once
#include <memory>
#include <optional>
#include <vector>

#include "windrow/linear_map/extension.h"
#include "windrow/overlap/overlap.h"

namespace windrow::overlap {

/// True area centroid (unit direction of the integral of x dA) and a tangent basis there, for every cell.
struct Centroids {
  std::vector<sphere::Vec3> direction, first, second;
};
Centroids centroids(const mesh::Mesh& mesh);

/// Cells that touch each cell (share a corner or a part of a side), ascending, itself left out: compressed rows.
struct Neighbours {
  std::vector<std::uint64_t> start;
  std::vector<std::uint32_t> cell;
};
Neighbours neighbours(const mesh::Mesh& mesh);

/// Gradient of a field of cell means for conservative_linear: least squares over the neighbours that have a value, in
/// the tangent plane at the area centroid. Limited (Barth & Jespersen 1989, AIAA-89-0366): no corner of a cell exceeds
/// the cell means around it. A total is divided by its cell's area first, and multiplied again. Columns: [values |
/// first | second].
std::unique_ptr<linear_map::Extension> make_gradient(const mesh::Mesh& source, linear_map::Quantity quantity,
                                                     bool limited);

/// Mass-preserving smooth interpolation (Tobler 1979, JASA 74, 519): some sweeps of neighbour means over the mesh,
/// then every source cell's integral over its part of the mesh is restored (to 1e-10 relative; Error(defect) when that
/// does not converge), by the least change of the mesh values, over the connected region where mesh cells straddle
/// borders; with `non_negative` under the condition that no value is below zero (a source cell that is not above zero
/// gives zero). A source cell without a mesh cell to itself (a sliver at the rim, cells finer than the mesh's) is
/// restored together with the one it shares most area with: by itself it could not always be. Columns: [values |
/// multipliers]. With `non_negative` the map is to be applied with linear_map::Weights::not_below = 0.
struct Smooth {
  linear_map::LinearMap map;
  Closure closure;
  std::unique_ptr<linear_map::Extension> extension;
};
Smooth conservative_smooth(const mesh::Mesh& source, const mesh::Mesh& target, bool non_negative);
/// The extension of such a map, also of one that was stored.
std::unique_ptr<linear_map::Extension> make_multipliers(const linear_map::LinearMap& map, bool non_negative);

/// Bilinear interpolation between source cell centres at the target's centres, on the sphere: in the quadrilateral of
/// centres of a structured grid that holds the point, also across the date line and a closed grid's seam; in the
/// triangle of centres of any other grid; around a pole between the centres of the last row and their mean. Points
/// beyond the outermost centres but inside a source cell take the nearest point of the hull. Weights are >= 0 and sum
/// to 1; no pairing for a target centre outside the source's cells.
linear_map::LinearMap bilinear(const mesh::Mesh& source, const mesh::Mesh& target);

/// One pairing of share 1 with the source cell whose centre is nearest to the target cell's centre (great-circle
/// distance; the lower number of equals), where the source has a cell at the target's centre.
linear_map::LinearMap nearest(const mesh::Mesh& source, const mesh::Mesh& target);

/// A scalar map (with its extension, or none) carried over to tangent vectors. Columns are the Cartesian components of
/// the source vectors: [x values | y values | z values | x increments | y ... | z ...]; rows are the component of the
/// result along `axis` (one unit tangent a row) at the target's centres.
linear_map::LinearMap vector_map(const linear_map::LinearMap& scalar, const std::vector<sphere::Vec3>& axis);

/// Unit tangents at every cell's centre: towards east and north, or along growing x and to its left (grid-relative).
/// Error(data) when grid-relative ones are asked of a mesh without such a direction.
struct Axes {
  std::vector<sphere::Vec3> first, second;
};
Axes true_axes(const mesh::Mesh& mesh);
Axes grid_axes(const mesh::Mesh& mesh);

}  // namespace windrow::overlap
