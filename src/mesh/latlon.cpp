// Latitude-longitude cells: two lists of edges; no polygon is stored.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {
namespace {

// Bounds computed in single precision and widened overshoot by less than this; more is a wrong file.
constexpr double kOvershoot_deg = 1e-4;

double radians(double degrees) { return Angle::degrees(degrees).radians(); }

class LatLonMesh final : public Mesh {
 public:
  LatLonMesh(LatLonEdges edges, const Earth& earth) : edges_(std::move(edges)), earth_(earth) {
    for (const double phi : edges_.lat_deg) sphere_lat_deg_.push_back(authalic_latitude_deg(phi, earth_.e2));
  }

  std::size_t size() const override { return nx() * ny(); }
  std::pair<std::size_t, std::size_t> shape() const override { return {ny(), nx()}; }
  sphere::Polygon cell(std::size_t index) const override {
    sphere::Polygon out;
    cell_into(index, out);
    return out;
  }
  void cell_into(std::size_t index, sphere::Polygon& out) const override;
  double area(std::size_t index) const override {
    const double south = radians(south_of(index));
    const double north = radians(north_of(index));
    return radians(width(index)) * 2 * std::cos(0.5 * (south + north)) * std::sin(0.5 * (north - south));
  }
  double perimeter(std::size_t index) const override {
    const double south = radians(south_of(index));
    const double north = radians(north_of(index));
    return 2 * (north - south) + radians(width(index)) * (std::cos(south) + std::cos(north));
  }
  GeoPoint centre(std::size_t index) const override {
    const std::size_t i = index % nx();
    const std::size_t j = index / nx();
    return {Angle::degrees(0.5 * (edges_.lon_deg[i] + edges_.lon_deg[i + 1])),
            Angle::degrees(0.5 * (edges_.lat_deg[j] + edges_.lat_deg[j + 1]))};
  }
  std::optional<std::size_t> find(GeoPoint point) const override;
  const LatLonEdges* latlon() const override { return &edges_; }
  bool on_rim(std::size_t index) const override;
  std::optional<sphere::Vec3> x_direction(std::size_t index) const override {
    const sphere::SinCos lambda = sphere::sincos_degrees(centre(index).longitude.degrees());
    return sphere::Vec3{-lambda.sin, lambda.cos, 0};
  }
  Earth earth() const override { return earth_; }
  codec::Digest digest() const override {
    codec::Hasher hasher;
    hasher.add(std::string("latlon")).add(static_cast<std::int64_t>(nx()));
    for (const double lambda : edges_.lon_deg) hasher.add(lambda);
    for (const double phi : edges_.lat_deg) hasher.add(phi);
    return hasher.add(earth_.e2).finish();
  }
  std::string describe() const override {
    const auto& lon = edges_.lon_deg;
    const auto& lat = edges_.lat_deg;
    const bool global = all_round(edges_) && lat.front() == -90 && lat.back() == 90;
    const std::string extent = global ? "global"
                                      : fmt::format("{:.6g} to {:.6g} degrees east, {:.6g} to {:.6g} degrees north",
                                                    lon.front(), lon.back(), lat.front(), lat.back());
    return fmt::format("latitude-longitude, {} x {} cells, {}", ny(), nx(), extent);
  }

 private:
  std::size_t nx() const { return edges_.lon_deg.size() - 1; }
  std::size_t ny() const { return edges_.lat_deg.size() - 1; }
  double south_of(std::size_t index) const { return sphere_lat_deg_[index / nx()]; }
  double north_of(std::size_t index) const { return sphere_lat_deg_[index / nx() + 1]; }
  double width(std::size_t index) const { return edges_.lon_deg[index % nx() + 1] - edges_.lon_deg[index % nx()]; }

  LatLonEdges edges_;
  std::vector<double> sphere_lat_deg_;  // latitude edges on the unit sphere
  Earth earth_;
};

// A box of at most 90 x 90 degrees; edges of no length (at a pole) are left out.
void box(double west, double east, double south, double north, sphere::Piece& out) {
  using sphere::Circle;
  out.loops.resize(1);
  sphere::Loop& loop = out.loops.front();
  loop.clear();
  const sphere::Vec3 sw = sphere::point_degrees(west, south);
  const sphere::Vec3 se = sphere::point_degrees(east, south);
  const sphere::Vec3 nw = sphere::point_degrees(west, north);
  const sphere::Vec3 ne = sphere::point_degrees(east, north);
  const double width = radians(east - west);
  const double rise = radians(north - south);
  if (south > -90) loop.push_back({sw, se, Circle::parallel_degrees(south), width});
  loop.push_back({se, ne, Circle::meridian_degrees(east), -rise});
  if (north < 90) loop.push_back({ne, nw, Circle::parallel_degrees(north), -width});
  loop.push_back({nw, sw, Circle::meridian_degrees(west), rise});
}

void LatLonMesh::cell_into(std::size_t index, sphere::Polygon& out) const {
  const double west = edges_.lon_deg[index % nx()];
  const double south = south_of(index);
  const double north = north_of(index);
  const auto columns = static_cast<std::size_t>(std::ceil(width(index) / 90));
  const std::size_t rows = north - south > 90 ? 2 : 1;
  out.pieces.resize(columns * rows);
  const double middle = 0.5 * (south + north);
  for (std::size_t k = 0; k < columns; ++k) {
    const double w = west + width(index) * static_cast<double>(k) / static_cast<double>(columns);
    const double e = k + 1 == columns ? edges_.lon_deg[index % nx() + 1]
                                      : west + width(index) * static_cast<double>(k + 1) / static_cast<double>(columns);
    box(w, e, south, rows == 1 ? north : middle, out.pieces[k * rows]);
    if (rows == 2) box(w, e, middle, north, out.pieces[k * rows + 1]);
  }
}

bool LatLonMesh::on_rim(std::size_t index) const {
  const std::size_t i = index % nx(), j = index / nx();
  const bool west_or_east = (i == 0 || i + 1 == nx()) && !all_round(edges_);
  const bool south = j == 0 && edges_.lat_deg.front() > -90;
  const bool north = j + 1 == ny() && edges_.lat_deg.back() < 90;
  return west_or_east || south || north;
}

// Degrees that went through radians and back are off by a few 1e-14 * 360: a point this near an edge is on it.
constexpr double kOnEdge_deg = 1e-12;

// Position of the cell with edge[i] < value <= edge[i + 1]; the first edge belongs to the first cell.
std::optional<std::size_t> locate(const std::vector<double>& edges, double value) {
  if (!(value >= edges.front() - kOnEdge_deg && value <= edges.back() + kOnEdge_deg)) return {};
  const auto above = std::lower_bound(edges.begin() + 1, edges.end() - 1, value - kOnEdge_deg);
  return static_cast<std::size_t>(above - edges.begin()) - 1;
}

std::optional<std::size_t> LatLonMesh::find(GeoPoint point) const {
  const std::optional<std::size_t> row = locate(edges_.lat_deg, point.latitude.degrees());
  if (!row) return {};
  const double start = edges_.lon_deg.front();
  // The lowest turn that is not west of the mesh: on the seam of a global mesh, that is its first column.
  const double lambda = point.longitude.degrees();
  const double turns = std::ceil((start - kOnEdge_deg - lambda) / 360);
  const std::optional<std::size_t> column = locate(edges_.lon_deg, lambda + 360 * turns);
  if (!column) return {};
  return *row * nx() + *column;
}

void check_ascending(const std::vector<double>& edges, const char* what, const std::string& place) {
  if (edges.size() < 2) throw Error(Failure::data, place, fmt::format("{} edges: expected at least two", what));
  for (std::size_t k = 0; k + 1 < edges.size(); ++k) {
    if (!(edges[k] < edges[k + 1])) {
      throw Error(Failure::data, place,
                  fmt::format("{} edges must ascend strictly, but {} is followed by {}", what, edges[k], edges[k + 1]));
    }
  }
  if (!std::isfinite(edges.front()) || !std::isfinite(edges.back())) {
    throw Error(Failure::data, place, fmt::format("{} edges must be finite", what));
  }
}

}  // namespace

MeshPtr make_latlon(LatLonEdges edges, const Earth& earth, const std::string& place) {
  check_ascending(edges.lon_deg, "longitude", place);
  check_ascending(edges.lat_deg, "latitude", place);
  auto& lon = edges.lon_deg;
  auto& lat = edges.lat_deg;
  if (lat.front() < -90 - kOvershoot_deg || lat.back() > 90 + kOvershoot_deg) {
    throw Error(Failure::data, place,
                fmt::format("latitude edges reach from {} to {}, expected -90 to 90", lat.front(), lat.back()));
  }
  const double span = lon.back() - lon.front();
  if (span > 360 + kOvershoot_deg) {
    throw Error(Failure::data, place, fmt::format("longitude edges span {} degrees, expected at most 360", span));
  }
  lat.front() = std::max(lat.front(), -90.0);
  lat.back() = std::min(lat.back(), 90.0);
  if (std::abs(span - 360) <= kOvershoot_deg) lon.back() = lon.front() + 360;
  if (!(lon[lon.size() - 2] < lon.back() && lat.front() < lat[1] && lat[lat.size() - 2] < lat.back())) {
    throw Error(Failure::data, place, "the outermost cells are narrower than the rounding of their edges");
  }
  return std::make_shared<LatLonMesh>(std::move(edges), earth);
}

}  // namespace windrow::mesh
