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
#include "windrow/base/notices.h"
#include "windrow/codec/digest.h"
#include "windrow/mesh/cell_records.h"
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
  /// Set when latlon() is meant in a frame turned against the geographic one: rotated-pole grids.
  [[nodiscard]] virtual const Rotation* rotation() const { return nullptr; }
  /// May the region this mesh covers end at this cell? Cells that are not on the rim are surrounded by others, so what
  /// overlaps none but those lies wholly within the mesh. Overlapping cells (catchments) are all on the rim.
  [[nodiscard]] virtual bool on_rim(std::size_t index) const = 0;
  /// Unit tangent at the cell's centre along growing x of a structured mesh: what grid-relative vectors refer to.
  /// Nothing where cells have no such direction.
  [[nodiscard]] virtual std::optional<sphere::Vec3> x_direction(std::size_t /*index*/) const { return {}; }
  /// True for polygons drawn by hand (catchments): they may overlap each other and have any number of corners.
  [[nodiscard]] virtual bool cells_may_overlap() const { return false; }
  /// False for points (towns): cells without area, which conservative methods cannot reach.
  [[nodiscard]] virtual bool has_area() const { return true; }
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

/// Cells between parallels and meridians of a rotated frame: circles too, about the rotated pole. On the sphere only
/// (earth.e2 == 0; on an ellipsoid they are no circles: use make_projected with rotated_projector). Error(data) as for
/// make_latlon, or a pole outside the globe. A rotation by nothing gives make_latlon's mesh.
MeshPtr make_rotated(LatLonEdges edges, const Rotation& rotation, const Earth& earth, const std::string& place);
Projector rotated_projector(const Rotation& rotation);  ///< rotated degrees -> geographic degrees
Projector geographic_to_rotated_projector(const Rotation& rotation);

/// Cells listed by their corners. Corners that differ by less than the rounding of their file (`corners.rounding_deg`,
/// and at most a hundredth of the shortest side there) become one, so that neighbours share edges to the bit. Repeated
/// corners are dropped; loops that run clockwise are turned round (noted once). With Sides::parallels a side between
/// two corners of one latitude (within the rounding) runs along it the short way round, otherwise all sides are great
/// circles. Error(data) naming the first cell: fewer than three corners, no area, sides over 90 degrees, more than half
/// the globe, a loop that crosses itself (not for quadrilaterals that merely are concave).
MeshPtr make_cells(CellCorners corners, Sides sides, const Earth& earth, const std::string& place, Notices& notices);

/// Faces of a UGRID mesh, sides are great circles. Errors as make_cells; a node number out of range too.
MeshPtr make_faces(const FaceNodes& faces, const Earth& earth, const std::string& place, Notices& notices);

/// HEALPix cells (Gorski et al. 2005, ApJ 622, 759; CF 1.13 appendix F), levels may be mixed. Sides are
/// circle arcs that stray from the exact boundaries by at most 1e-6 of a cell, as much to either side: every cell's
/// area is 4 pi / (12 * 4^level) within 1e-9 (up to level 20; beyond it the rounding of unit vectors shows). The
/// latitude is authalic: `e2_of_file` (0: sphere) turns it into a geodetic one before `earth` turns that back; equal
/// ones cancel.
MeshPtr make_healpix(const std::vector<HealpixCell>& cells, double e2_of_file, const Earth& earth,
                     const std::string& place);
/// Numbering of CF 1.13 appendix F. Error(data) for a number out of range.
HealpixCell healpix_from_ring(int level, std::uint64_t ring, const std::string& place);
HealpixCell healpix_from_nuniq(std::uint64_t nuniq, const std::string& place);
HealpixCell healpix_from_zuniq(std::uint64_t zuniq, const std::string& place);

/// Polygons with holes and many parts, in coordinates that `to_geographic` understands (degrees: pass an identity); a
/// straight line of those coordinates becomes circle arcs as for make_projected. Cells may overlap each other. In
/// geographic coordinates a jump of more than 180 degrees between neighbours means the short way round. Error(data)
/// names the cell by `names` (one a cell): no area, over half the globe in one part, crosses itself.
MeshPtr make_polygons(std::vector<PolygonCell> cells, std::vector<std::string> names, const Projector& to_geographic,
                      const Earth& earth, const std::string& crs_key, const std::string& place);

/// Points without area; has_area() is false, polygons are empty.
MeshPtr make_points(std::vector<GeoPoint> points, const Earth& earth);

/// Some cells of another mesh, in the order given (gathered grids). A cell is on the rim when it is on that of `full`,
/// or when the neighbour beyond one of its edges is not among them. Error(data) for a cell that `full` does not have.
MeshPtr make_subset(MeshPtr full, std::vector<std::uint32_t> cells);

/// Corners of curvilinear cells from their centres (degrees, ny x nx): inner corners at the mean direction of the four
/// centres around them, outer ones continued. Rows whose last column is followed by their first are closed round; then
/// an outermost line that would leave less than half a row open (at a pole) becomes a point. A last row that goes on in
/// its own other half, backwards, is folded onto itself (ocean grids with two northern poles). Error(data) where
/// neighbours are so far apart (over 20 degrees of arc, or four times the median spacing along that axis) that nothing
/// can be inferred: it names the place and the gap.
CellCorners infer_corners(const std::vector<double>& centre_lon_deg, const std::vector<double>& centre_lat_deg,
                          std::size_t ny, std::size_t nx, const std::string& place);

/// Cell edges of a Gaussian grid from its quadrature weights: sin(edge) accumulates weights (standards: weights sum to
/// 1 per hemisphere). `is_gaussian` compares with the roots of the Legendre polynomial within 2e-4 degrees... callers
/// say so.
bool is_gaussian(const std::vector<double>& latitudes_deg);
std::vector<double> gaussian_latitudes_deg(std::size_t count);  ///< ascending
std::vector<double> gaussian_edges_deg(std::size_t count);      ///< count + 1, ascending

}  // namespace windrow::mesh
