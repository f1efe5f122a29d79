// Do rings cross? A tree of boxes over the segments in the order they are drawn, compared with itself (and a turn
// further round the globe), then an orientation test whose answer rounding cannot change.
#include <algorithm>
#include <cmath>
#include <limits>

#include "polygons_lines.h"

namespace windrow::mesh::polygons {
namespace {

constexpr double kEps = std::numeric_limits<double>::epsilon();

struct Point {
  double x, y;
};
struct Segment {
  Point a, b;
  std::size_t next;  // the one that goes on from b
};
struct Bounds {
  Point low{1e300, 1e300}, high{-1e300, -1e300};
  void add(const Point& p) {
    low = {std::min(low.x, p.x), std::min(low.y, p.y)};
    high = {std::max(high.x, p.x), std::max(high.y, p.y)};
  }
  void add(const Bounds& other) {
    add(other.low);
    add(other.high);
  }
  [[nodiscard]] bool meets(const Bounds& other, double shift) const {
    return low.x <= other.high.x + shift && other.low.x + shift <= high.x && low.y <= other.high.y &&
           other.low.y <= high.y;
  }
};

// The same vertex has the same coordinates in all segments that are drawn in the same turn round the globe.
void append_segments(const Lines& lines, const Outline& ring, std::vector<Segment>& out) {
  double turn = 0;
  const std::size_t first = out.size();
  for (const Step& step : ring.steps) {
    const auto& from = lines.vertices()[lines.start(step)];
    const auto& to = lines.vertices()[lines.end(step)];
    const double next = lines.geographic() ? turn + std::round((from[0] + lines.dx(step) - to[0]) / 360) : 0;
    out.push_back({{from[0] + 360 * turn, from[1]}, {to[0] + 360 * next, to[1]}, out.size() + 1});
    turn = next;
  }
  if (out.size() > first) out.back().next = first;
}

// +1: `p` lies left of the line, -1: right, 0: too near to say.
int side_of(const Segment& line, const Point& p) {
  const double dx = line.b.x - line.a.x, dy = line.b.y - line.a.y;
  const double first = dx * (p.y - line.a.y), second = dy * (p.x - line.a.x);
  // Coordinates of another turn are rounded once more: four eps of the largest.
  const double largest = std::max(
      {std::abs(line.a.x), std::abs(line.b.x), std::abs(p.x), std::abs(line.a.y), std::abs(line.b.y), std::abs(p.y)});
  const double doubt = 4 * kEps * (std::abs(first) + std::abs(second) + largest * (std::abs(dx) + std::abs(dy)));
  const double turned = first - second;
  return turned > doubt ? 1 : turned < -doubt ? -1 : 0;
}

bool cross(const Segment& s, const Segment& t) {
  return side_of(s, t.a) * side_of(s, t.b) < 0 && side_of(t, s.a) * side_of(t, s.b) < 0;
}

// Does the ring pass from one side of `t` to the other at the end of `s`, which lies within `t`?
bool crosses_at_end(const Segment& s, const Segment& after, const Segment& t) {
  const Point& p = s.b;
  const int before = side_of(t, s.a);
  if (before == 0 || side_of(t, p) != 0) return false;
  const double tx = t.b.x - t.a.x, ty = t.b.y - t.a.y;
  const double f = ((p.x - t.a.x) * tx + (p.y - t.a.y) * ty) / (tx * tx + ty * ty);
  constexpr double kEnd = 1e-12;
  // The next segment begins where this one ends, if need be a turn further round the globe.
  const Point next{after.b.x + (p.x - after.a.x), after.b.y};
  return f > kEnd && f < 1 - kEnd && before * side_of(t, next) < 0;
}

Point meeting(const Segment& s, const Segment& t) {
  const double sx = s.b.x - s.a.x, sy = s.b.y - s.a.y, tx = t.b.x - t.a.x, ty = t.b.y - t.a.y;
  const double f = ((t.a.x - s.a.x) * ty - (t.a.y - s.a.y) * tx) / (sx * ty - sy * tx);
  return {s.a.x + f * sx, s.a.y + f * sy};
}

class Tree {
 public:
  explicit Tree(std::vector<Segment> segments) : segment_(std::move(segments)) {
    if (!segment_.empty()) build(1, 0, segment_.size());
  }
  std::optional<Point> crossing(double shift) {
    found_.reset();
    if (!segment_.empty()) compare({1, 0, segment_.size()}, {1, 0, segment_.size()}, shift);
    return found_;
  }

 private:
  struct Node {
    std::size_t number, first, last;
    [[nodiscard]] std::size_t count() const { return last - first; }
    [[nodiscard]] Node left() const { return {2 * number, first, first + count() / 2}; }
    [[nodiscard]] Node right() const { return {2 * number + 1, first + count() / 2, last}; }
  };
  const Bounds& build(std::size_t number, std::size_t first, std::size_t last) {
    Bounds bounds;
    if (last - first == 1) {
      bounds.add(segment_[first].a);
      bounds.add(segment_[first].b);
    } else {
      const Node node{number, first, last};
      for (const Node& half : {node.left(), node.right()}) bounds.add(build(half.number, half.first, half.last));
    }
    if (number >= bounds_.size()) bounds_.resize(std::max(number + 1, 2 * bounds_.size()));
    return bounds_[number] = bounds;
  }
  // Segments of `a` against those of `b` moved by `shift`; pairs of a node with itself are taken once.
  void compare(const Node& a, const Node& b, double shift) {
    if (found_ || !bounds_[a.number].meets(bounds_[b.number], shift)) return;
    if (a.count() == 1 && b.count() == 1) {
      Segment moved = segment_[b.first];
      moved.a.x += shift;
      moved.b.x += shift;
      const Segment& s = segment_[a.first];
      if (cross(s, moved)) found_ = meeting(s, moved);
      if (crosses_at_end(s, segment_[s.next], moved)) found_ = s.b;
      if (crosses_at_end(moved, segment_[moved.next], s)) found_ = moved.b;
      return;
    }
    if (a.number == b.number && shift == 0) {
      compare(a.left(), a.left(), 0);
      compare(a.right(), a.right(), 0);
      compare(a.left(), a.right(), 0);
    } else if (a.count() >= b.count()) {
      compare(a.left(), b, shift);
      compare(a.right(), b, shift);
    } else {
      compare(a, b.left(), shift);
      compare(a, b.right(), shift);
    }
  }

  std::vector<Segment> segment_;
  std::vector<Bounds> bounds_;  // of node k, whose halves are 2k and 2k + 1
  std::optional<Point> found_;
};

// Where steps meet again at one vertex, a pair of them crosses when the one leads from the other's left to its right.
struct Visit {
  std::uint32_t vertex;
  double in, out;  // directions back along the step that arrives and along the one that leaves
};

bool cross(const Visit& a, const Visit& b) {
  const auto turn = [&](double direction) {  // anticlockwise from a.out; whole turns dropped
    const double angle = std::fmod(direction - a.out + 8 * std::atan(1.0), 8 * std::atan(1.0));
    return angle;
  };
  constexpr double kSameWay = 1e-9;
  const double back = turn(a.in), in = turn(b.in), out = turn(b.out);
  const auto along = [&](double angle) {
    return angle < kSameWay || angle > 8 * std::atan(1.0) - kSameWay || std::abs(angle - back) < kSameWay;
  };
  if (along(in) || along(out)) return false;
  return (in < back) != (out < back);
}

std::optional<std::array<double, 2>> crossing_at_vertex(const Lines& lines, const std::vector<Outline>& part) {
  std::vector<Visit> visits;
  for (const Outline& ring : part) {
    for (std::size_t k = 0; k < ring.steps.size(); ++k) {
      const Step &arriving = ring.steps[k], &leaving = ring.steps[(k + 1) % ring.steps.size()];
      visits.push_back({lines.end(arriving), std::atan2(-lines.dy(arriving), -lines.dx(arriving)),
                        std::atan2(lines.dy(leaving), lines.dx(leaving))});
    }
  }
  std::sort(visits.begin(), visits.end(), [](const Visit& a, const Visit& b) { return a.vertex < b.vertex; });
  for (std::size_t k = 0; k < visits.size(); ++k) {
    for (std::size_t m = k + 1; m < visits.size() && visits[m].vertex == visits[k].vertex; ++m) {
      if (cross(visits[k], visits[m])) return lines.vertices()[visits[k].vertex];
    }
  }
  return {};
}

}  // namespace

std::optional<std::array<double, 2>> find_crossing(const Lines& lines, const std::vector<Outline>& part) {
  std::vector<Segment> segments;
  for (const Outline& ring : part) append_segments(lines, ring, segments);
  Tree tree(std::move(segments));
  std::optional<Point> found = tree.crossing(0);
  if (!found && lines.geographic()) found = tree.crossing(360);
  if (found) return std::array{found->x, found->y};
  return crossing_at_vertex(lines, part);
}

bool lies_within(const Lines& lines, const Outline& hole, const Outline& outer) {
  std::vector<Segment> around, inner;
  append_segments(lines, outer, around);
  append_segments(lines, hole, inner);
  // A vertex of the hole on the outline says nothing: the first one that is clearly on one side decides.
  for (const Segment& s : inner) {
    for (const double shift : {0.0, 360.0, -360.0}) {
      const Point p{s.a.x + shift, s.a.y};
      bool inside = false, near = false;
      for (const Segment& edge : around) {
        if (std::max(edge.a.y, edge.b.y) < p.y || std::min(edge.a.y, edge.b.y) > p.y) continue;
        const int side = side_of(edge, p);
        near = near || (side == 0 && std::min(edge.a.x, edge.b.x) <= p.x && std::max(edge.a.x, edge.b.x) >= p.x);
        if ((edge.a.y > p.y) != (edge.b.y > p.y) && (side > 0) == (edge.b.y > edge.a.y)) inside = !inside;
      }
      if (near) break;
      if (inside) return true;
      if (!lines.geographic()) return false;
      if (shift < 0) return false;
    }
  }
  return true;
}

}  // namespace windrow::mesh::polygons
