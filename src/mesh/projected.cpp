// Cells of a projected grid: corners and bends are stored, polygons are made when asked for.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "projected_edges.h"
#include "surface.h"
#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

// Of a WKT the name of its projection method, of any other key the key itself.
std::string short_name(const std::string& key) {
  const std::string mark = "METHOD[\"";
  const auto at = key.find(mark);
  if (at == std::string::npos) return key;
  const auto from = at + mark.size();
  return key.substr(from, key.find('"', from) - from);
}

class ProjectedMesh final : public Mesh {
 public:
  ProjectedMesh(std::vector<double> x, std::vector<double> y, ProjectedLines lines, Projector to_geographic,
                Projector from_geographic, const Earth& earth, std::string crs_key)
      : x_(std::move(x)),
        y_(std::move(y)),
        lines_(std::move(lines)),
        to_geographic_(std::move(to_geographic)),
        from_geographic_(std::move(from_geographic)),
        earth_(earth),
        crs_key_(std::move(crs_key)) {}

  /// Areas of all cells, and the sense in which x and y turn on the globe. Error(data) where the grid folds over
  /// itself.
  void measure(const std::string& place);

  std::size_t size() const override { return lines_.nx * lines_.ny; }
  std::pair<std::size_t, std::size_t> shape() const override { return {lines_.ny, lines_.nx}; }
  sphere::Polygon cell(std::size_t index) const override {
    sphere::Polygon out;
    cell_into(index, out);
    return out;
  }
  void cell_into(std::size_t index, sphere::Polygon& out) const override;
  std::optional<Hull> hull(std::size_t index) const override {
    const std::size_t j = index / lines_.nx, i = index % lines_.nx;
    return Hull{{lines_.at(j, i), lines_.at(j, i + 1), lines_.at(j + 1, i + 1), lines_.at(j + 1, i)}, margin_};
  }
  double area(std::size_t index) const override { return area_[index]; }
  double perimeter(std::size_t index) const override { return sphere::perimeter(cell(index)); }
  GeoPoint centre(std::size_t index) const override {
    const std::size_t j = index / lines_.nx, i = index % lines_.nx;
    std::vector<double> x{0.5 * (x_[i] + x_[i + 1])};
    std::vector<double> y{0.5 * (y_[j] + y_[j + 1])};
    to_geographic_(x, y);
    return {Angle::degrees(x[0]), Angle::degrees(y[0])};
  }
  std::optional<std::size_t> find(GeoPoint point) const override;
  bool on_rim(std::size_t index) const override {
    const std::size_t j = index / lines_.nx, i = index % lines_.nx;
    return i == 0 || j == 0 || i + 1 == lines_.nx || j + 1 == lines_.ny;
  }
  std::optional<Vec3> x_direction(std::size_t index) const override;
  Earth earth() const override { return earth_; }
  codec::Digest digest() const override {
    codec::Hasher hasher;
    hasher.add(std::string("projected")).add(crs_key_).add(static_cast<std::int64_t>(lines_.nx));
    for (const double x : x_) hasher.add(x);
    for (const double y : y_) hasher.add(y);
    return hasher.add(earth_.e2).finish();
  }
  std::string describe() const override {
    return fmt::format("projected ({}), {} x {} cells", short_name(crs_key_), lines_.ny, lines_.nx);
  }

 private:
  std::vector<double> x_, y_;
  ProjectedLines lines_;
  std::vector<double> area_;
  double margin_ = 0;
  bool mirrored_ = false;  // y runs to the right of x on the globe: loops are turned round
  Projector to_geographic_, from_geographic_;
  Earth earth_;
  std::string crs_key_;
};

std::optional<Vec3> ProjectedMesh::x_direction(std::size_t index) const {
  const std::size_t j = index / lines_.nx, i = index % lines_.nx;
  const double middle = 0.5 * (x_[i] + x_[i + 1]);
  const double step = (x_[i + 1] - x_[i]) / 512;  // bends add the square of this part of a cell, rounding its inverse
  std::vector<double> x{middle - step, middle, middle + step};
  std::vector<double> y(3, 0.5 * (y_[j] + y_[j + 1]));
  to_geographic_(x, y);
  const auto place = [&](std::size_t k) { return GeoPoint{Angle::degrees(x[k]), Angle::degrees(y[k])}; };
  return tangent_between(place(0), place(2), place(1), earth_);
}

void reverse_from(sphere::Loop& loop, std::size_t first) {
  std::reverse(loop.begin() + static_cast<std::ptrdiff_t>(first), loop.end());
  for (std::size_t k = first; k < loop.size(); ++k) loop[k] = loop[k].reversed();
}

void ProjectedMesh::cell_into(std::size_t index, sphere::Polygon& out) const {
  const std::size_t j = index / lines_.nx, i = index % lines_.nx;
  const Vec3 &sw = lines_.at(j, i), &se = lines_.at(j, i + 1), &nw = lines_.at(j + 1, i), &ne = lines_.at(j + 1, i + 1);
  out.pieces.resize(1);
  out.pieces.front().loops.resize(1);
  sphere::Loop& loop = out.pieces.front().loops.front();
  loop.clear();
  lines_.arcs(lines_.along_edge(j, i), sw, se, loop);
  lines_.arcs(lines_.up_edge(j, i + 1), se, ne, loop);
  std::size_t before = loop.size();
  lines_.arcs(lines_.along_edge(j + 1, i), nw, ne, loop);
  reverse_from(loop, before);
  before = loop.size();
  lines_.arcs(lines_.up_edge(j, i), sw, nw, loop);
  reverse_from(loop, before);
  if (mirrored_) reverse_from(loop, 0);
}

// Largest distance of an edge's points from the chords between the cell's corners.
double bulge(const sphere::Loop& loop, const Hull& hull) {
  double most = 0;
  for (const sphere::Arc& arc : loop) {
    double off = arc.circle.radius * arc.dtheta * arc.dtheta / 8;  // >= r (1 - cos(dtheta / 2))
    const bool at_corner =
        std::any_of(hull.corner.begin(), hull.corner.end(), [&](const Vec3& c) { return c == arc.from; });
    if (!at_corner) {  // an inner point of a split edge: no farther from the edge's chord than from any point of it
      double nearest = 4;
      for (std::size_t k = 0; k < 4; ++k) {
        const Vec3& a = hull.corner[k];
        const Vec3 side = hull.corner[(k + 1) % 4] - a;
        const double length2 = std::max(dot(side, side), 1e-300);
        const double f = std::clamp(dot(arc.from - a, side) / length2, 0.0, 1.0);
        nearest = std::min(nearest, norm(arc.from - a - f * side));
      }
      off += nearest;
    }
    most = std::max(most, off);
  }
  return most;
}

void ProjectedMesh::measure(const std::string& place) {
  const std::size_t count = size();
  area_.resize(count);
  double most = 0;
#pragma omp parallel
  {
    sphere::Polygon polygon;
#pragma omp for schedule(static) reduction(max : most)
    for (std::size_t k = 0; k < count; ++k) {
      cell_into(k, polygon);
      const sphere::Loop& loop = polygon.pieces.front().loops.front();
      area_[k] = sphere::loop_area(loop);
      // Inner points of split edges count with the bulge of the arc that ends there.
      most = std::max(most, 2 * bulge(loop, *hull(k)));
    }
  }
  margin_ = most;
  mirrored_ = area_.front() < 0;
  for (std::size_t k = 0; k < count; ++k) {
    if (mirrored_) area_[k] = -area_[k];
    if (!(area_[k] > 0)) {
      const std::size_t j = k / lines_.nx, i = k % lines_.nx;
      throw Error(Failure::data, place,
                  fmt::format("the mesh folds over itself or has no area on the globe at x = {} to {}, y = {} to {}",
                              x_[i], x_[i + 1], y_[j], y_[j + 1]));
    }
  }
}

std::optional<std::size_t> ProjectedMesh::find(GeoPoint point) const {
  std::vector<double> x{point.longitude.degrees()};
  std::vector<double> y{point.latitude.degrees()};
  from_geographic_(x, y);
  const auto locate = [](const std::vector<double>& edges, double value) -> std::optional<std::size_t> {
    if (!(value >= edges.front() && value <= edges.back())) return {};
    return static_cast<std::size_t>(std::lower_bound(edges.begin() + 1, edges.end() - 1, value) - edges.begin()) - 1;
  };
  const std::optional<std::size_t> i = locate(x_, x[0]);
  const std::optional<std::size_t> j = locate(y_, y[0]);
  if (!i || !j) return {};
  // Some projections give distant points the same coordinates: the way back tells.
  constexpr double kSamePlace = 1e-7;  // rad, 0.6 m
  to_geographic_(x, y);
  if (!(norm(sphere::point_degrees(x[0], y[0]) - sphere::point(point)) < kSamePlace)) return {};
  return *j * lines_.nx + *i;
}

void check_edges(const std::vector<double>& edges, const char* axis, const std::string& place) {
  if (edges.size() < 2) throw Error(Failure::data, place, fmt::format("{} edges: expected at least two", axis));
  for (std::size_t k = 0; k + 1 < edges.size(); ++k) {
    if (!(edges[k] < edges[k + 1])) {
      throw Error(Failure::data, place,
                  fmt::format("{} edges must ascend strictly, but {} is followed by {}", axis, edges[k], edges[k + 1]));
    }
  }
}

}  // namespace

MeshPtr make_projected(std::vector<double> x_edges, std::vector<double> y_edges, const Projector& to_geographic,
                       const Projector& from_geographic, const Earth& earth, const std::string& crs_key,
                       const std::string& place) {
  check_edges(x_edges, "x", place);
  check_edges(y_edges, "y", place);
  ProjectedLines lines = build_lines(x_edges, y_edges, to_geographic, earth, place);
  auto mesh = std::make_shared<ProjectedMesh>(std::move(x_edges), std::move(y_edges), std::move(lines), to_geographic,
                                              from_geographic, earth, crs_key);
  mesh->measure(place);
  return mesh;
}

}  // namespace windrow::mesh
