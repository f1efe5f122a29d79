// Cells with shared edges: their arcs, measures, rim and search. Where edges run was decided before.
#include "edged_mesh.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>
#include <numbers>

#include "surface.h"
#include "windrow/base/error.h"
#include "windrow/base/exact_sum.h"
#include "windrow/codec/codec.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh {
namespace {

using sphere::Arc;
using sphere::Vec3;

constexpr double kPi = std::numbers::pi;
constexpr double kOnEdge = 2e-14;      // rad: degrees that became radians and a direction are off by less
constexpr double kWholeGlobe = 1e-12;  // relative
constexpr double kSmallCell = 0.5;     // chord of a cell that has a hull
constexpr double kSliver = 1e-14;      // sr: pieces cut off a cell may be this far below zero

// The short way from one node to another of the same z; in parts of at most 90 degrees.
void parallel_arcs(const Vec3& from, const Vec3& to, sphere::Loop& out) {
  const double radius = std::hypot(from.x, from.y);
  const double size = std::abs(from.z);
  const sphere::Circle circle{{0, 0, 1}, from.z, radius, radius * radius / (1 + size)};
  const double left = from.x * (to.y - from.y) - from.y * (to.x - from.x);
  const double dtheta = std::atan2(left, from.x * to.x + from.y * to.y);
  const auto parts = static_cast<int>(std::ceil(std::abs(dtheta) / (0.5 * kPi * (1 + sphere::kOnCircle))));
  const Arc whole{from, to, circle, dtheta};
  Vec3 a = from;
  for (int k = 1; k <= parts; ++k) {
    const Vec3 b = k == parts ? to : point_on(whole, static_cast<double>(k) / parts);
    out.push_back({a, b, circle, dtheta / parts});
    a = b;
  }
}

bool on_arc(const Arc& arc, const Vec3& p) {
  if (!(std::abs(height(arc.circle, p)) <= kOnEdge)) return false;
  const double reach = norm(arc.to - arc.from) + kOnEdge;
  return norm(p - arc.from) <= reach && norm(p - arc.to) <= reach;
}

bool holds(const sphere::Polygon& polygon, const Vec3& p) {
  for (const sphere::Piece& piece : polygon.pieces) {
    for (const sphere::Loop& loop : piece.loops) {
      if (std::any_of(loop.begin(), loop.end(), [&](const Arc& arc) { return on_arc(arc, p); })) return true;
    }
    if (contains(piece, p)) return true;
  }
  return false;
}

// A quick no: the point lies beyond a side that no corner lies beyond.
bool beyond_a_side(const Hull& hull, const Vec3& p) {
  for (std::size_t k = 0; k < 4; ++k) {
    const Vec3& a = hull.corner[k];
    const Vec3 left = cross(a, hull.corner[(k + 1) % 4] - a);
    const double allowed = -(hull.margin + kOnEdge) * norm(left);
    if (dot(left, p) >= allowed) continue;
    if (dot(left, hull.corner[(k + 2) % 4]) >= 0 && dot(left, hull.corner[(k + 3) % 4]) >= 0) return true;
  }
  return false;
}

// How far the arc of an edge bulges from its chord; nothing for an arc of over 90 degrees.
std::optional<double> bulge(const Vec3& from, const Vec3& to, const EdgedCells::Edge& edge) {
  const double half = 0.5 * norm(to - from);
  const double radius2 = edge.run == EdgedCells::Run::parallel
                             ? from.x * from.x + from.y * from.y
                             : (1 + edge.tilt * edge.tilt * half * half) / (1 + edge.tilt * edge.tilt);
  if (radius2 < 2 * half * half) return {};
  return half * half / (std::sqrt(radius2) + std::sqrt(radius2 - half * half));
}

template <typename T>
void add_values(codec::Hasher& hasher, const std::vector<T>& values) {
  static_assert(std::has_unique_object_representations_v<T> || std::is_same_v<T, double> || std::is_same_v<T, Vec3>);
  hasher.add(static_cast<std::int64_t>(values.size())).add(std::as_bytes(std::span(values)));
}

}  // namespace

std::uint32_t EdgedCells::add_edge(std::uint32_t from, std::uint32_t to, double tilt) {
  edge.push_back({from, to, tilt, 0, 1, Run::tilted});
  return static_cast<std::uint32_t>(edge.size() - 1);
}

std::uint32_t EdgedCells::add_parallel(std::uint32_t from, std::uint32_t to) {
  edge.push_back({from, to, 0, 0, 1, Run::parallel});
  return static_cast<std::uint32_t>(edge.size() - 1);
}

std::uint32_t EdgedCells::add_bent(std::uint32_t from, std::uint32_t to, std::span<const Vec3> points) {
  if (points.size() == 1) return add_edge(from, to, sphere::tilt_through(node[from], points[0], node[to]));
  const auto first = static_cast<std::uint32_t>(inner.size());
  inner.insert(inner.end(), points.begin(), points.end());
  inner_tilt.resize(inner.size());
  for (std::size_t k = 0; k < points.size(); k += 2) {
    const Vec3& before = k == 0 ? node[from] : points[k - 1];
    const Vec3& after = k + 1 == points.size() ? node[to] : points[k + 1];
    inner_tilt[first + k] = sphere::tilt_through(before, points[k], after);
  }
  edge.push_back({from, to, 0, first, static_cast<std::uint16_t>((points.size() + 1) / 2), Run::split});
  return static_cast<std::uint32_t>(edge.size() - 1);
}

void EdgedCells::arcs(Use use_of_edge, sphere::Loop& out) const {
  const Edge& e = edge[use_of_edge / 2];
  const std::size_t before = out.size();
  const Vec3 &from = node[e.from], &to = node[e.to];
  if (e.run == Run::tilted) {
    out.push_back(arc_through(from, to, e.tilt));
  } else if (e.run == Run::parallel) {
    parallel_arcs(from, to, out);
  } else {
    Vec3 a = from;
    for (std::size_t k = 0; k < e.parts; ++k) {
      const Vec3 b = k + 1 == e.parts ? to : inner[e.inner + 2 * k + 1];
      out.push_back(arc_through(a, b, inner_tilt[e.inner + 2 * k]));
      a = b;
    }
  }
  if ((use_of_edge & 1U) == 0) return;
  std::reverse(out.begin() + static_cast<std::ptrdiff_t>(before), out.end());
  for (std::size_t k = before; k < out.size(); ++k) out[k] = out[k].reversed();
}

EdgedMesh::EdgedMesh(EdgedCells cells, EdgedTraits traits, const std::string& place)
    : cells_(std::move(cells)), traits_(std::move(traits)) {
  measure(place);
  find_rim();
  make_digest();
}

std::pair<std::size_t, std::size_t> EdgedMesh::shape() const {
  return traits_.nx == 0 ? std::pair<std::size_t, std::size_t>(1, area_.size()) : std::pair(traits_.ny, traits_.nx);
}

std::pair<std::size_t, std::size_t> EdgedMesh::pieces_of(std::size_t cell) const {
  if (cells_.cell_start.empty()) return {cell, cell + 1};
  return {cells_.cell_start[cell], cells_.cell_start[cell + 1]};
}

std::pair<std::size_t, std::size_t> EdgedMesh::loops_of_piece(std::size_t piece) const {
  if (cells_.piece_start.empty()) return {piece, piece + 1};
  return {cells_.piece_start[piece], cells_.piece_start[piece + 1]};
}

std::span<const EdgedCells::Use> EdgedMesh::uses_of(std::size_t cell) const {
  const auto [first_piece, last_piece] = pieces_of(cell);
  if (first_piece == last_piece) return {};
  const std::size_t first = loops_of_piece(first_piece).first, last = loops_of_piece(last_piece - 1).second;
  return {cells_.use.data() + cells_.loop_start[first], cells_.use.data() + cells_.loop_start[last]};
}

sphere::Polygon EdgedMesh::cell(std::size_t index) const {
  sphere::Polygon out;
  cell_into(index, out);
  return out;
}

void EdgedMesh::cell_into(std::size_t index, sphere::Polygon& out) const {
  const auto [first, last] = pieces_of(index);
  out.pieces.resize(last - first);
  for (std::size_t p = first; p < last; ++p) {
    const auto [first_loop, last_loop] = loops_of_piece(p);
    auto& loops = out.pieces[p - first].loops;
    loops.resize(last_loop - first_loop);
    for (std::size_t l = first_loop; l < last_loop; ++l) {
      sphere::Loop& loop = loops[l - first_loop];
      loop.clear();
      for (const EdgedCells::Use use : cells_.loop(l)) cells_.arcs(use, loop);
    }
  }
}

void EdgedMesh::measure(const std::string& place) {
  area_.resize(cells_.cells());
  perimeter_.resize(area_.size());
#pragma omp parallel
  {
    sphere::Polygon polygon;
#pragma omp for schedule(static)
    for (std::size_t k = 0; k < area_.size(); ++k) {
      EdgedMesh::cell_into(k, polygon);
      double sum = 0;
      for (const sphere::Piece& piece : polygon.pieces) {
        const double part = sphere::signed_area(piece);
        sum += part > -kSliver ? std::max(0.0, part) : std::numeric_limits<double>::quiet_NaN();
      }
      area_[k] = sum;
      perimeter_[k] = sphere::perimeter(polygon);
    }
  }
  const auto bad = std::find_if(area_.begin(), area_.end(), [](double a) { return !(a > 0); });
  if (bad == area_.end()) return;
  const auto k = static_cast<std::size_t>(bad - area_.begin());
  throw Error(Failure::data, place, (traits_.name ? traits_.name(k) : fmt::format("cell {}", k)) + " has no area");
}

void EdgedMesh::find_rim() {
  rim_.assign(area_.size(), traits_.overlapping);
  if (traits_.overlapping) return;
  ExactSum whole;
  for (const double area : area_) whole.add(area);
  if (std::abs(whole.value() / (4 * kPi) - 1) <= kWholeGlobe) return;
  // An edge that is used once has nothing beyond it. Edges within a cell, between its pieces, are used twice.
  std::vector<std::uint8_t> used(cells_.edge.size());
  for (const EdgedCells::Use use : cells_.use)
    used[use / 2] = static_cast<std::uint8_t>(std::min(2, used[use / 2] + 1));
  for (std::size_t k = 0; k < area_.size(); ++k) {
    const auto uses = uses_of(k);
    rim_[k] = std::any_of(uses.begin(), uses.end(), [&](EdgedCells::Use use) { return used[use / 2] == 1; });
  }
}

void EdgedMesh::make_digest() {
  codec::Hasher hasher;
  hasher.add("edged " + traits_.kind).add(traits_.earth.e2);
  hasher.add(static_cast<std::int64_t>(EdgedMesh::shape().first))
      .add(static_cast<std::int64_t>(EdgedMesh::shape().second));
  add_values(hasher, cells_.node);
  add_values(hasher, cells_.inner);
  add_values(hasher, cells_.use);
  add_values(hasher, cells_.loop_start);
  add_values(hasher, cells_.piece_start);
  add_values(hasher, cells_.cell_start);
  add_values(hasher, cells_.centre_lon_deg);
  add_values(hasher, cells_.centre_lat_deg);
  std::vector<std::uint64_t> edges;  // without the bytes between members
  edges.reserve(3 * cells_.edge.size());
  for (const EdgedCells::Edge& e : cells_.edge) {
    edges.push_back(std::uint64_t{e.from} << 32 | e.to);
    edges.push_back(std::bit_cast<std::uint64_t>(e.tilt));
    edges.push_back(std::uint64_t{e.inner} << 32 | std::uint64_t{e.parts} << 8 | static_cast<std::uint64_t>(e.run));
  }
  add_values(hasher, edges);
  digest_ = hasher.finish();
}

std::optional<Hull> EdgedMesh::hull(std::size_t index) const {
  const auto [first, last] = pieces_of(index);
  if (last - first != 1) return {};
  const auto [first_loop, last_loop] = loops_of_piece(first);
  if (last_loop - first_loop != 1) return {};
  const std::span<const EdgedCells::Use> uses = cells_.loop(first_loop);
  if (uses.size() < 3 || uses.size() > 4) return {};
  Hull out;
  for (std::size_t k = 0; k < 4; ++k) {
    const EdgedCells::Use use = uses[std::min(k, uses.size() - 1)];
    out.corner[k] = cells_.node[cells_.start_node(use)];
    const EdgedCells::Edge& edge = cells_.edge[use / 2];
    if (edge.run == EdgedCells::Run::split) return {};
    const std::optional<double> off = bulge(cells_.node[edge.from], cells_.node[edge.to], edge);
    if (!off) return {};
    out.margin = std::max(out.margin, *off);
  }
  if (norm(out.corner[2] - out.corner[0]) > kSmallCell || norm(out.corner[3] - out.corner[1]) > kSmallCell) return {};
  out.margin = out.margin * (1 + 1e-9) + sphere::kOnCircle;
  return out;
}

GeoPoint EdgedMesh::centre(std::size_t index) const {
  if (!cells_.centre_lon_deg.empty()) {
    return {Angle::degrees(cells_.centre_lon_deg[index]), Angle::degrees(cells_.centre_lat_deg[index])};
  }
  Vec3 sum;
  for (const EdgedCells::Use use : uses_of(index)) sum = sum + cells_.node[cells_.start_node(use)];
  return position_of(sum, traits_.earth);
}

std::optional<std::size_t> EdgedMesh::find(GeoPoint point) const {
  std::call_once(index_once_, [this] { index_ = std::make_unique<const Index>(*this); });
  const Vec3 p = direction_of(point, traits_.earth);
  Box box;
  box.add(p, kOnEdge);
  thread_local std::vector<std::uint32_t> candidates;
  thread_local sphere::Polygon polygon;
  index_->find(box, candidates);
  for (const std::uint32_t k : candidates) {
    const std::optional<Hull> corners = hull(k);
    if (corners && beyond_a_side(*corners, p)) continue;
    cell_into(k, polygon);
    if (holds(polygon, p)) return k;
  }
  return {};
}

Vec3 EdgedMesh::middle_of(EdgedCells::Use use) const {
  sphere::Loop arcs;
  cells_.arcs(use, arcs);
  const Arc& half_way = arcs[arcs.size() / 2];
  return arcs.size() % 2 == 0 ? half_way.from : point_on(half_way, 0.5);
}

std::optional<Vec3> EdgedMesh::x_direction(std::size_t index) const {
  const std::size_t nx = traits_.nx;
  if (traits_.ny < 2 || nx < 2) return {};
  const std::span<const EdgedCells::Use> own = uses_of(index);
  const auto shared_with = [&](std::size_t other) {
    const std::span<const EdgedCells::Use> theirs = uses_of(other);
    return std::find_if(own.begin(), own.end(), [&](EdgedCells::Use use) {
      return std::any_of(theirs.begin(), theirs.end(), [&](EdgedCells::Use t) { return t / 2 == use / 2; });
    });
  };
  const std::size_t row = index / nx * nx, i = index % nx;
  auto right = own.end(), left = own.end();
  if (i + 1 < nx || nx > 2) right = shared_with(row + (i + 1) % nx);
  if (i > 0 || nx > 2) left = shared_with(row + (i + nx - 1) % nx);
  const auto opposite = [&](auto side) {
    return own.size() == 4 ? own.begin() + (side - own.begin() + 2) % 4 : own.end();
  };
  if (right == own.end() && left == own.end()) return {};
  if (right == own.end()) right = opposite(left);
  if (left == own.end()) left = opposite(right);
  const GeoPoint at = centre(index);
  const GeoPoint from = left == own.end() ? at : position_of(middle_of(*left), traits_.earth);
  const GeoPoint to = right == own.end() ? at : position_of(middle_of(*right), traits_.earth);
  return tangent_between(from, to, at, traits_.earth);
}

}  // namespace windrow::mesh
