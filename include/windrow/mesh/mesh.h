// Every grid and mesh as cells with declared edges. A model grid and a product mesh are the same kind of thing.
#pragma once
#include <cstddef>
#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/codec/digest.h"
#include "windrow/sphere/polygon.h"

namespace windrow::mesh {

/// Extent of a structured latitude-longitude block: edges ascending, longitude edges spanning at most 360 degrees.
struct LatLonEdges {
  std::vector<double> lon_deg;  ///< nx + 1
  std::vector<double> lat_deg;  ///< ny + 1, within -90..90
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
  [[nodiscard]] virtual double area(std::size_t index) const = 0;       ///< steradians
  [[nodiscard]] virtual double perimeter(std::size_t index) const = 0;  ///< radians
  [[nodiscard]] virtual GeoPoint centre(std::size_t index) const = 0;
  /// The cell that contains the point (an edge belongs to the lower-numbered cell), or nothing.
  [[nodiscard]] virtual std::optional<std::size_t> find(GeoPoint point) const = 0;
  /// Set when all cells are latitude-longitude rectangles of one block: allows the analytic shortcut.
  [[nodiscard]] virtual const LatLonEdges* latlon() const { return nullptr; }
  /// Digest of everything that decides geometry; equal digests mean equal linear maps.
  [[nodiscard]] virtual codec::Digest digest() const = 0;
  /// One line for people: "latitude-longitude, 96 x 192 cells, global".
  [[nodiscard]] virtual std::string describe() const = 0;
};

using MeshPtr = std::shared_ptr<const Mesh>;

/// Takes mesh coordinates to geodetic degrees, in place: x -> longitude, y -> latitude. A point the projection cannot
/// reach becomes NaN. Thread-safe.
using Projector = std::function<void(std::vector<double>& x, std::vector<double>& y)>;

/// How latitude is understood: on the sphere as given, or geodetic on an ellipsoid and turned into authalic latitude
/// (Snyder 1987, PP 1395, eqs 3-11, 3-12), so that areas are those of the ellipsoid.
struct Earth {
  double radius_m = 6371007.1809;  ///< sphere radius, or the ellipsoid's authalic radius
  double e2 = 0;                   ///< first eccentricity squared; 0: sphere
  bool operator==(const Earth&) const = default;
  static Earth sphere(double radius_m);
  static Earth ellipsoid(double semi_major_m, double inverse_flattening);
};
double authalic_latitude_deg(double geodetic_deg, double e2);

/// Latitude-longitude cells. Error(data) when edges are not strictly ascending, leave -90..90 or span over 360 degrees.
MeshPtr make_latlon(LatLonEdges edges, const Earth& earth, const std::string& place);

/// Cells of a projected grid given by its edges (ascending). Corners and edge midpoints go through `to_geographic` once
/// for the whole mesh; an edge is the circle through both ends and the projected midpoint, split until the lens area of
/// an edge differs from its halves' by at most 1e-11 of the cell. `from_geographic` serves find().
/// Error(data) when a corner has no place on the globe.
MeshPtr make_projected(std::vector<double> x_edges, std::vector<double> y_edges, const Projector& to_geographic,
                       const Projector& from_geographic, const Earth& earth, const std::string& crs_key,
                       const std::string& place);

/// Cell edges of a Gaussian grid from its quadrature weights: sin(edge) accumulates weights (standards: weights sum to 1
/// per hemisphere). `is_gaussian` compares with the roots of the Legendre polynomial within 2e-4 degrees... callers say so.
bool is_gaussian(const std::vector<double>& latitudes_deg);
std::vector<double> gaussian_latitudes_deg(std::size_t count);  ///< ascending
std::vector<double> gaussian_edges_deg(std::size_t count);      ///< count + 1, ascending

}  // namespace windrow::mesh
