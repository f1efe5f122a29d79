// From loops of corners to edges: repeated corners out, sense of turning checked, each side laid once for both cells.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <tuple>

#include "listed_cells.h"
#include "surface.h"
#include "windrow/base/error.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

constexpr std::uint32_t kNone = std::numeric_limits<std::uint32_t>::max();
constexpr double kRightAngle = -1e-12;   // cosine of the longest side
constexpr double kStraightAngle = 1e-9;  // rad: parallels nearer to half a turn have no short way round
constexpr double kPart_rad = 0.8;        // longest part of a side that follows nearly equal latitudes
constexpr double kCrossing = 1e-12;      // rad: sides that cross by less merely touch

double longitude_between(const Vec3& a, const Vec3& b) {
  return std::atan2(a.x * b.y - a.y * b.x, a.x * b.x + a.y * b.y);
}

// Do great-circle sides a-b and c-d cross, each with its ends well on either side of the other?
bool cross_over(const Vec3& a, const Vec3& b, const Vec3& c, const Vec3& d) {
  const Vec3 ab = unit(cross(a + b, b - a)), cd = unit(cross(c + d, d - c));
  const auto apart = [](double one, double other) {
    return std::min(std::abs(one), std::abs(other)) > kCrossing && (one > 0) != (other > 0);
  };
  return apart(dot(ab, c), dot(ab, d)) && apart(dot(cd, a), dot(cd, b)) && dot(a + b, c + d) > 0;
}

class Layer {
 public:
  Layer(const ListedCells& listed, const std::string& place)
      : listed_(listed), place_(place), first_(merge_points(listed)), node_of_(listed.point.size(), kNone) {}

  void add_cell(std::size_t cell);
  [[nodiscard]] std::size_t turned() const { return turned_; }
  EdgedCells take() { return std::move(out_); }

 private:
  [[noreturn]] void refuse(std::size_t cell, const std::string& what) const {
    throw Error(Failure::data, place_, listed_.name(cell) + " " + what);
  }
  void clean(std::size_t cell);
  void check_shape(std::size_t cell) const;
  void turn_left(std::size_t cell);
  void check_crossings(std::size_t cell) const;
  std::uint32_t lay_side(EdgedCells& cells, std::uint32_t a, std::uint32_t b, std::uint32_t point_a,
                         std::uint32_t point_b) const;
  std::uint32_t node(std::uint32_t point);
  EdgedCells::Use side(std::uint32_t from, std::uint32_t to);
  [[nodiscard]] const Vec3& at(std::size_t k) const { return listed_.point[loop_[k % loop_.size()]]; }

  const ListedCells& listed_;
  const std::string& place_;
  std::vector<std::uint32_t> first_;    // of each point: the point it is one with
  std::vector<std::uint32_t> node_of_;  // of each point: its node
  std::vector<std::uint32_t> point_of_;
  std::vector<std::uint32_t> first_edge_, next_edge_;  // edges by their lower node
  std::vector<std::uint32_t> loop_;                    // points of the cell at hand
  EdgedCells out_, scratch_;
  sphere::Loop arcs_;
  std::size_t turned_ = 0;
};

// Corners without repetitions; a side that is walked there and straight back is none.
void Layer::clean(std::size_t cell) {
  loop_.clear();
  for (const std::uint32_t c : listed_.corners(cell)) {
    const std::uint32_t p = first_[c];
    if (!loop_.empty() && loop_.back() == p) continue;
    if (loop_.size() >= 2 && loop_[loop_.size() - 2] == p) {
      loop_.pop_back();
      continue;
    }
    loop_.push_back(p);
  }
  while (loop_.size() >= 2) {
    if (loop_.back() == loop_.front()) {
      loop_.pop_back();
    } else if (loop_.size() >= 3 && loop_[loop_.size() - 2] == loop_.front()) {
      loop_.resize(loop_.size() - 2);
    } else if (loop_.size() >= 3 && loop_.back() == loop_[1]) {
      loop_.erase(loop_.begin());
      loop_.pop_back();
    } else {
      break;
    }
  }
}

void Layer::check_shape(std::size_t cell) const {
  const std::size_t n = loop_.size();
  if (n < 3) {
    refuse(cell, fmt::format("has {} different corners, expected at least three", n));
  }
  Vec3 middle;
  for (std::size_t k = 0; k < n; ++k) middle = middle + at(k);
  for (std::size_t k = 0; k < n; ++k) {
    if (dot(at(k), at(k + 1)) < kRightAngle) {
      refuse(cell, fmt::format("has a side of {:.4g} degrees, expected at most 90",
                               Angle::radians(std::acos(std::max(-1.0, dot(at(k), at(k + 1))))).degrees()));
    }
    if (!(dot(at(k), middle) > 0)) refuse(cell, "reaches over more than half the globe");
  }
}

// Pairs of sides that have no corner in common.
void Layer::check_crossings(std::size_t cell) const {
  const std::size_t n = loop_.size();
  for (std::size_t k = 0; k < n; ++k) {
    for (std::size_t m = k + 1; m < n; ++m) {
      const bool pinched = loop_[k] == loop_[m];
      const bool apart = m >= k + 2 && (k > 0 || m + 1 < n);
      if (pinched || (apart && cross_over(at(k), at(k + 1), at(m), at(m + 1)))) refuse(cell, "crosses itself");
    }
  }
}

std::uint32_t Layer::lay_side(EdgedCells& cells, std::uint32_t a, std::uint32_t b, std::uint32_t point_a,
                              std::uint32_t point_b) const {
  const Vec3 &from = cells.node[a], &to = cells.node[b];
  const double lat_a = listed_.lat_deg[point_a], lat_b = listed_.lat_deg[point_b];
  const bool level = listed_.sides == Sides::parallels && std::abs(lat_a - lat_b) <= listed_.rounding_deg;
  if (!level) return cells.add_edge(a, b);
  if (from.z == to.z) return cells.add_parallel(a, b);
  // Latitudes that differ by rounding: the side goes through points between them at equal steps of longitude.
  const double turn = longitude_between(from, to);
  const auto parts = static_cast<std::size_t>(std::ceil(std::abs(turn) / kPart_rad));
  std::vector<Vec3> points;
  const double lambda = std::atan2(from.y, from.x);
  for (std::size_t k = 1; k < 2 * parts; ++k) {
    const double f = static_cast<double>(k) / static_cast<double>(2 * parts);
    const double z = from.z + f * (to.z - from.z), r = std::sqrt((1 - z) * (1 + z));
    points.push_back({r * std::cos(lambda + f * turn), r * std::sin(lambda + f * turn), z});
  }
  return points.empty() ? cells.add_edge(a, b) : cells.add_bent(a, b, points);
}

// Turns a clockwise loop round. Whichever corner a list begins with, the loop begins with the same one, and the same
// cells in another sense give the same mesh.
void Layer::turn_left(std::size_t cell) {
  const auto n = static_cast<std::uint32_t>(loop_.size());
  scratch_.node.clear();
  scratch_.edge.clear();
  scratch_.inner.clear();
  arcs_.clear();
  for (std::uint32_t k = 0; k < n; ++k) scratch_.node.push_back(at(k));
  double length = 0;
  for (std::uint32_t k = 0; k < n; ++k) {
    const bool apart = std::abs(longitude_between(at(k), at(k + 1))) < std::numbers::pi - kStraightAngle;
    const std::uint32_t e = lay_side(scratch_, k, (k + 1) % n, loop_[k], loop_[(k + 1) % n]);
    if (!apart && scratch_.edge[e].run != EdgedCells::Run::tilted) {
      refuse(cell, "has a side along half a parallel: both ways round are equally long");
    }
    scratch_.arcs(2 * e, arcs_);
  }
  for (const sphere::Arc& arc : arcs_) length += arc.length();
  const double area = sphere::loop_area(arcs_);
  if (!(std::abs(area) > 8 * std::numeric_limits<double>::epsilon() * length)) refuse(cell, "has no area");
  if (area < 0) {
    std::reverse(loop_.begin(), loop_.end());
    ++turned_;
  }
  const auto lowest = std::min_element(loop_.begin(), loop_.end(), [&](std::uint32_t a, std::uint32_t b) {
    const Vec3 &p = listed_.point[a], &q = listed_.point[b];
    return std::tie(p.x, p.y, p.z) < std::tie(q.x, q.y, q.z);
  });
  std::rotate(loop_.begin(), lowest, loop_.end());
}

std::uint32_t Layer::node(std::uint32_t point) {
  std::uint32_t& number = node_of_[point];
  if (number == kNone) {
    number = static_cast<std::uint32_t>(out_.node.size());
    out_.node.push_back(listed_.point[point]);
    point_of_.push_back(point);
    first_edge_.push_back(kNone);
  }
  return number;
}

EdgedCells::Use Layer::side(std::uint32_t from, std::uint32_t to) {
  const std::uint32_t a = std::min(from, to), b = std::max(from, to);
  const EdgedCells::Use against = from == a ? 0 : 1;
  for (std::uint32_t e = first_edge_[a]; e != kNone; e = next_edge_[e]) {
    if (out_.edge[e].to == b) return 2 * e + against;
  }
  const std::uint32_t e = lay_side(out_, a, b, point_of_[a], point_of_[b]);
  next_edge_.push_back(first_edge_[a]);
  first_edge_[a] = e;
  return 2 * e + against;
}

void Layer::add_cell(std::size_t cell) {
  clean(cell);
  check_shape(cell);
  check_crossings(cell);
  turn_left(cell);
  for (const std::uint32_t p : loop_) node(p);
  for (std::size_t k = 0; k < loop_.size(); ++k) {
    out_.use.push_back(side(node_of_[loop_[k]], node_of_[loop_[(k + 1) % loop_.size()]]));
  }
  out_.close_loop();
}

}  // namespace

EdgedCells lay_edges(const ListedCells& listed, const std::string& place, Notices& notices) {
  Layer layer(listed, place);
  for (std::size_t k = 0; k < listed.cells(); ++k) layer.add_cell(k);
  if (layer.turned() > 0) {
    notices.add(place, fmt::format("{} of {} cells list their corners clockwise: taken the other way round",
                                   layer.turned(), listed.cells()));
  }
  return layer.take();
}

}  // namespace windrow::mesh
