// Every grid and mesh as cells with declared edges. A model grid and a product mesh are the same kind of thing.
#pragma once
#include <array>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/codec/digest.h"
#include "windrow/mesh/latlon_edges.h"
#include "windrow/mesh/projector.h"
#include "windrow/sphere/polygon.h"

namespace windrow::mesh {

/// Corners of a small cell: every point of its boundary is within `margin` (chord length) of their convex hull. So a
/// half-space that holds all corners by the margin holds the cell: an exact decision without building its edges.
struct Hull {
  std::array<sphere::Vec3, 4> corner;
  double margin = 0;
};

/// Cells of one mesh, numbered 0..size()-1 row by row (y ascending, then x). Areas are steradians on the unit sphere.
class Mesh {
 public:
  virtual ~Mesh() = default;
  [[nodiscard]] virtual std::size_t size() const = 0;
  /// (ny, nx) of a structured mesh, (1, size) otherwise.
  [[nodiscard]] virtual std::pair<std::size_t, std::size_t> shape() const = 0;
  /// The cell as a closed region on the unit sphere, bounded by circle arcs, interior on the left.
  [[nodiscard]] virtual sphere::Polygon cell(std::size_t index) const = 0;
  /// The same into memory that is used again (for loops over many cells).
  virtual void cell_into(std::size_t index, sphere::Polygon& out) const { out = cell(index); }
  /// Nothing where cells have no cheap hull: then decide on the polygon itself.
  [[nodiscard]] virtual std::optional<Hull> hull(std::size_t /*index*/) const { return {}; }
  [[nodiscard]] virtual double area(std::size_t index) const = 0;       ///< steradians
  [[nodiscard]] virtual double perimeter(std::size_t index) const = 0;  ///< radians
  [[nodiscard]] virtual GeoPoint centre(std::size_t index) const = 0;
  /// The cell that contains the point (an edge belongs to the lower-numbered cell), or nothing.
  [[nodiscard]] virtual std::optional<std::size_t> find(GeoPoint point) const = 0;
  /// Set when all cells are latitude-longitude rectangles of one block: allows the analytic shortcut.
  [[nodiscard]] virtual const LatLonEdges* latlon() const { return nullptr; }
  /// How this mesh's latitudes (those of latlon() too) become latitudes of the unit sphere.
  [[nodiscard]] virtual Earth earth() const { return {}; }
  /// Digest of everything that decides geometry; equal digests mean equal linear maps.
  [[nodiscard]] virtual codec::Digest digest() const = 0;
  /// One line for people: "latitude-longitude, 96 x 192 cells, global".
  [[nodiscard]] virtual std::string describe() const = 0;
};

using MeshPtr = std::shared_ptr<const Mesh>;

/// Latitude-longitude cells. Error(data) when edges are not strictly ascending, leave -90..90 or span over 360 degrees.
MeshPtr make_latlon(LatLonEdges edges, const Earth& earth, const std::string& place);

/// Cells of a projected grid given by its edges (ascending). Corners and edge midpoints go through `to_geographic` once
/// for the whole mesh; an edge is the circle through both ends and the projected midpoint, split until the lens area of
/// an edge differs from its halves' by at most 1e-11 of the cell. `from_geographic` serves find().
/// Error(data) when a corner has no place on the globe.
MeshPtr make_projected(std::vector<double> x_edges, std::vector<double> y_edges, const Projector& to_geographic,
                       const Projector& from_geographic, const Earth& earth, const std::string& crs_key,
                       const std::string& place);

/// Cell edges of a Gaussian grid from its quadrature weights: sin(edge) accumulates weights (standards: weights sum to
/// 1 per hemisphere). `is_gaussian` compares with the roots of the Legendre polynomial within 2e-4 degrees... callers
/// say so.
bool is_gaussian(const std::vector<double>& latitudes_deg);
std::vector<double> gaussian_latitudes_deg(std::size_t count);  ///< ascending
std::vector<double> gaussian_edges_deg(std::size_t count);      ///< count + 1, ascending

}  // namespace windrow::mesh
