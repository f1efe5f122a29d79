// Clipping by a half-space: arcs are cut where they cross, kept runs are joined along the clip circle. No areas.
#include "windrow/sphere/clip.h"

#include <algorithm>
#include <numbers>

namespace windrow::sphere {
namespace {

constexpr double kPi = std::numbers::pi;

struct CutArc {
  Arc arc;
  bool keep;
  bool on_circle = false;
};

// A run of kept arcs: enters the half-space at its start, leaves it at its end.
struct Chain {
  std::size_t first, count;  // in Scratch::kept
  bool used = false;
  bool on_circle = true;  // nothing but arcs of the clip circle: bounds no area
};

struct Scratch {
  std::vector<CutArc> cut;
  std::vector<Arc> kept;
  std::vector<Chain> chains;
};

double squared(const Vec3& v) { return dot(v, v); }

// Angle of the part from a to b of an arc on circle c, of an arc of at most 90 degrees.
double part_angle(const Circle& c, const Vec3& a, const Vec3& b, double whole) {
  const double half = std::min(1.0, 0.5 * std::sqrt(squared(b - a)) / c.radius);
  return std::copysign(std::min(std::abs(whole), 2 * std::asin(half)), whole);
}

// Nearly coincident circles put a crossing anywhere: it must not leave the arc. The rule is the same from both ends.
Vec3 within(const Arc& arc, const Vec3& x) {
  const double from = squared(x - arc.from);
  const double to = squared(x - arc.to);
  const double chord = squared(arc.to - arc.from);
  if (from <= chord && to <= chord) return x;
  return from > to ? arc.to : arc.from;
}

class Cutter {
 public:
  Cutter(const Circle& half_space, std::vector<CutArc>& out)
      : plane_(half_space), tolerance_(kOnCircle * half_space.radius), out_(out) {}

  void cut(const Arc& arc, double h_from, double h_to) {
    const bool from_in = h_from >= -tolerance_;
    const bool to_in = h_to >= -tolerance_;
    if (from_in != to_in) return cut_once(arc, h_from, h_to);
    const double sagitta = arc.circle.radius * arc.dtheta * arc.dtheta / 8;
    const double nearest = std::min(std::abs(h_from), std::abs(h_to));
    if (nearest > sagitta) {
      out_.push_back({arc, from_in});
      return;
    }
    if (std::abs(h_from) <= tolerance_ && std::abs(h_to) <= tolerance_ &&
        std::abs(height(plane_, point_on(arc, 0.5))) <= 2 * tolerance_) {
      // The edge lies on the clip circle: it bounds the result only when the region is on the kept side of it.
      const bool same_sense = (dot(arc.circle.n, plane_.n) > 0) == (arc.dtheta > 0);
      out_.push_back({arc, same_sense, true});
      return;
    }
    cut_twice(arc, from_in);
  }

 private:
  // Change of height along the arc at one of its points, up to a positive factor.
  [[nodiscard]] double climb(const Arc& arc, const Vec3& x) const {
    const double s = dot(plane_.n, cross(arc.circle.n, x));
    return arc.dtheta > 0 ? s : -s;
  }
  [[nodiscard]] Crossings meet(const Arc& arc) const {
    return crossings(arc.dtheta > 0 ? arc.circle : arc.circle.reversed(), plane_);
  }
  void push(const Arc& whole, const Vec3& a, const Vec3& b, bool keep) {
    const double angle = part_angle(whole.circle, a, b, whole.dtheta);
    if (angle != 0) out_.push_back({{a, b, whole.circle, angle}, keep});
  }

  void cut_once(const Arc& arc, double h_from, double h_to) {
    const bool from_in = h_from >= -tolerance_;
    // An end on the circle is the crossing itself, unless the arc bulges to the kept side first.
    Vec3 x;
    if (from_in && h_from <= tolerance_ && climb(arc, arc.from) <= 0) {
      x = arc.from;
    } else if (!from_in && h_to <= tolerance_ && climb(arc, arc.to) >= 0) {
      x = arc.to;
    } else {
      const Crossings both = meet(arc);
      x = within(arc, from_in ? both.leaving : both.entering);
    }
    push(arc, arc.from, x, from_in);
    push(arc, x, arc.to, !from_in);
  }

  // Both ends on one side: the arc may still dip to the other one. A tangency within the tolerance is no crossing.
  void cut_twice(const Arc& arc, bool inside) {
    const double sign = inside ? 1 : -1;
    bool dips = sign * climb(arc, arc.from) < 0 && sign * climb(arc, arc.to) > 0;
    if (dips) {
      const Circle& c = arc.circle;
      // Perpendicular twice over: what is left of nearly parallel normals is mostly rounding, but must not leave the
      // arc.
      Vec3 across = cross(cross(c.n, plane_.n), c.n);
      across = across - dot(across, c.n) * c.n;
      const double size = norm(across);
      dips = size > 0 && sign * height(plane_, c.d * c.n - (sign * c.radius / size) * across) < -tolerance_;
    }
    if (!dips) {
      out_.push_back({arc, inside});
      return;
    }
    const Crossings both = meet(arc);
    const Vec3 first = within(arc, inside ? both.leaving : both.entering);
    const Vec3 second = within(arc, inside ? both.entering : both.leaving);
    push(arc, arc.from, first, inside);
    push(arc, first, second, !inside);
    push(arc, second, arc.to, inside);
  }

  const Circle& plane_;
  double tolerance_;
  std::vector<CutArc>& out_;
};

// Angles on the clip circle, and arcs along it.
class Rim {
 public:
  explicit Rim(const Circle& c) : c_(c) {
    u_ = unit(std::abs(c.n.z) < 0.6 ? cross(c.n, Vec3{0, 0, 1}) : cross(c.n, Vec3{1, 0, 0}));
    v_ = cross(c.n, u_);
  }
  [[nodiscard]] Vec3 at(double angle) const {
    return c_.d * c_.n + c_.radius * (std::cos(angle) * u_ + std::sin(angle) * v_);
  }
  // Positive angle from p on to q. Points closer than rounding can tell apart are one point, whichever comes first.
  [[nodiscard]] double angle(const Vec3& p, const Vec3& q) const {
    double delta = angle_of(q) - angle_of(p);
    if (delta > kPi) delta -= 2 * kPi;
    if (delta <= -kPi) delta += 2 * kPi;
    if (std::abs(delta) < 0.1) {
      const double exact = 2 * std::asin(std::min(1.0, 0.5 * norm(q - p) / c_.radius));
      delta = std::copysign(exact, delta);
    }
    if (delta < 0 && -delta * c_.radius <= kOnePoint) return 0;
    return delta < 0 ? delta + 2 * kPi : delta;
  }
  void add_arcs(const Vec3& p, const Vec3& q, double angle, Loop& loop) const {
    if (angle == 0) return;
    const int parts = static_cast<int>(std::ceil(angle / (0.5 * kPi * (1 + kOnCircle))));
    const double start = angle_of(p);
    Vec3 from = p;
    for (int k = 1; k <= parts; ++k) {
      const Vec3 to = k == parts ? q : at(start + angle * k / parts);
      loop.push_back({from, to, c_, angle / parts});
      from = to;
    }
  }

 private:
  static constexpr double kOnePoint = 16 * kOnCircle;  // two crossings, each off by a few kOnCircle
  [[nodiscard]] double angle_of(const Vec3& p) const { return std::atan2(dot(p, v_), dot(p, u_)); }
  const Circle& c_;
  Vec3 u_, v_;
};

// Adds the kept runs of one cut loop to the chains; returns false when the loop has no crossing.
bool collect_chains(Scratch& s) {
  const std::size_t n = s.cut.size();
  std::size_t start = n;
  for (std::size_t k = 0; k < n; ++k) {
    if (s.cut[k].keep && !s.cut[(k + n - 1) % n].keep) {
      start = k;
      break;
    }
  }
  if (start == n) return false;
  for (std::size_t k = 0; k < n; ++k) {
    const CutArc& a = s.cut[(start + k) % n];
    if (!a.keep) continue;
    if (!s.cut[(start + k + n - 1) % n].keep) s.chains.push_back({s.kept.size(), 0});
    s.kept.push_back(a.arc);
    ++s.chains.back().count;
    if (!a.on_circle) s.chains.back().on_circle = false;
  }
  std::erase_if(s.chains, [](const Chain& c) { return c.on_circle; });
  return true;
}

class Loops {
 public:
  explicit Loops(Piece& out) : out_(out) {}
  ~Loops() { out_.loops.resize(used_); }
  Loops(const Loops&) = delete;
  Loops& operator=(const Loops&) = delete;
  Loop& add() {  // reuses the memory of an earlier result
    if (used_ == out_.loops.size()) out_.loops.emplace_back();
    Loop& loop = out_.loops[used_++];
    loop.clear();
    return loop;
  }

 private:
  Piece& out_;
  std::size_t used_ = 0;
};

// Joins every exit to the next entry in the positive sense of the clip circle.
void join_chains(Scratch& s, const Circle& half_space, Loops& loops) {
  const Rim rim(half_space);
  for (Chain& head : s.chains) {
    if (head.used) continue;
    Loop& loop = loops.add();
    Chain* current = &head;
    do {
      current->used = true;
      loop.insert(loop.end(), s.kept.begin() + current->first, s.kept.begin() + current->first + current->count);
      const Vec3 exit = loop.back().to;
      Chain* next = nullptr;
      double nearest = 0;
      for (Chain& c : s.chains) {
        if (c.used && &c != &head) continue;
        const double angle = rim.angle(exit, s.kept[c.first].from);
        if (next == nullptr || angle < nearest) {
          next = &c;
          nearest = angle;
        }
      }
      rim.add_arcs(exit, s.kept[next->first].from, nearest, loop);
      current = next;
    } while (current != &head);
  }
}

// No edge crosses the circle: the region holds all of it or none. When all edges are on one side, the middle of the
// other side tells, which no edge comes near; only a ring around the circle needs a point of the circle itself.
void add_whole_circle(const Piece& piece, const Circle& half_space, Piece& out) {
  if (piece.loops.empty()) return;
  const Rim rim(half_space);
  Vec3 probe = half_space.n;
  if (out.loops.size() == piece.loops.size()) {
    probe = -half_space.n;
  } else if (!out.loops.empty()) {
    probe = rim.at(0);
  }
  if (!contains(piece, probe)) return;
  const Vec3 start = rim.at(0);
  out.loops.emplace_back();
  rim.add_arcs(start, start, 2 * kPi, out.loops.back());
}

}  // namespace

void clip(const Piece& piece, const Circle& half_space, Piece& out) {
  thread_local Scratch s;
  s.kept.clear();
  s.chains.clear();
  bool crossed = false;
  {
    Loops loops(out);
    for (const Loop& loop : piece.loops) {
      s.cut.clear();
      Cutter cutter(half_space, s.cut);
      const double h_first = height(half_space, loop.front().from);
      double h_from = h_first;
      for (std::size_t k = 0; k < loop.size(); ++k) {
        const double h_to = k + 1 == loop.size() ? h_first : height(half_space, loop[k + 1].from);
        cutter.cut(loop[k], h_from, h_to);
        h_from = h_to;
      }
      if (collect_chains(s)) {
        crossed = true;
      } else if (!s.cut.empty() && s.cut.front().keep) {
        loops.add() = loop;
      }
    }
    if (crossed) join_chains(s, half_space, loops);
  }
  if (!crossed) add_whole_circle(piece, half_space, out);
}

bool contains(const Piece& piece, const Vec3& p) {
  double turned = 0;
  for (const Loop& loop : piece.loops) {
    for (const Arc& arc : loop) {
      Vec3 a = arc.from - p;
      Vec3 b = arc.to - p;
      const double left = dot(p, cross(a, b));  // of the chord's great circle
      a = a - dot(p, a) * p;
      b = b - dot(p, b) * p;
      turned += std::atan2(left, dot(a, b));
      // Between the chord and the arc, which is near both ends, the arc passes on the other side of the point.
      const double chord = squared(arc.to - arc.from);
      if (squared(p - arc.from) > chord || squared(p - arc.to) > chord) continue;
      const double bulge_left = arc.dtheta > 0 ? -arc.circle.d : arc.circle.d;
      if (bulge_left == 0) continue;
      const double towards = arc.circle.d > 0 ? height(arc.circle, p) : -height(arc.circle, p);
      if (towards > 0 && left != 0 && (left > 0) == (bulge_left > 0)) turned += bulge_left > 0 ? -2 * kPi : 2 * kPi;
    }
  }
  return turned > kPi;
}

}  // namespace windrow::sphere
