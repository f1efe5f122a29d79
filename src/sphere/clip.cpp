// Clipping by a half-space: arcs are cut where they cross, kept runs are joined along the clip circle. No areas.
#include "windrow/sphere/clip.h"

#include <algorithm>
#include <array>
#include <numbers>

namespace windrow::sphere {
namespace {

constexpr double kPi = std::numbers::pi;
constexpr double kNotch = 1e-12;    // rad: notches so narrow may have their ends in the wrong order
constexpr double kAntipode = 1e-9;  // rad: well above rounding, well below any cell

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
  std::size_t next = 0;   // the chain that goes on, after
  double turn = 0;        // this angle along the clip circle
};

struct Crossing {
  double angle;
  std::size_t chain;
};

struct Scratch {
  std::vector<CutArc> cut;
  std::vector<Arc> kept;
  std::vector<Chain> chains;
  std::vector<Crossing> exits, entries;
  std::vector<double> angles;
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
    delta = refined(delta, p, q);
    if (delta < 0 && -delta * c_.radius <= kOnePoint) return 0;
    return delta < 0 ? delta + 2 * kPi : delta;
  }
  // An angle between points, from their distance where that is better.
  [[nodiscard]] double refined(double delta, const Vec3& p, const Vec3& q) const {
    if (std::abs(delta) >= 0.1) return delta;
    return std::copysign(2 * std::asin(std::min(1.0, 0.5 * norm(q - p) / c_.radius)), delta);
  }
  [[nodiscard]] double angle_of(const Vec3& p) const { return std::atan2(dot(p, v_), dot(p, u_)); }
  void add_arcs(const Vec3& p, const Vec3& q, double angle, Loop& loop) const {
    if (angle == 0) return;
    if (angle < 0) {  // back over a crossing that rounding put first
      loop.push_back({p, q, c_, angle});
      return;
    }
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

// Every exit goes on at the next entry in the positive sense of the clip circle. Returns the angle of all that.
double link_nearest(Scratch& s, const Rim& rim) {
  double total = 0;
  for (std::size_t head = 0; head < s.chains.size(); ++head) {
    if (s.chains[head].used) continue;
    std::size_t current = head;
    do {
      Chain& chain = s.chains[current];
      chain.used = true;
      const Vec3& exit = s.kept[chain.first + chain.count - 1].to;
      bool found = false;
      for (std::size_t k = 0; k < s.chains.size(); ++k) {
        if (s.chains[k].used && k != head) continue;
        const double angle = rim.angle(exit, s.kept[s.chains[k].first].from);
        if (found && !(angle < chain.turn)) continue;
        chain.next = k;
        chain.turn = angle;
        found = true;
      }
      total += chain.turn;
      current = chain.next;
    } while (current != head);
  }
  return total;
}

// The same where crossings at a small angle may have come out in the wrong order: exits and entries take turns along
// the circle, so the n-th exit belongs to the n-th entry, counted from a point that is clearly in or out of the region:
// the middle of the widest gap between crossings.
void link_in_order(Scratch& s, const Rim& rim, const Piece& piece) {
  s.exits.clear();
  s.entries.clear();
  s.angles.clear();
  for (std::size_t k = 0; k < s.chains.size(); ++k) {
    const Chain& chain = s.chains[k];
    s.exits.push_back({rim.angle_of(s.kept[chain.first + chain.count - 1].to), k});
    s.entries.push_back({rim.angle_of(s.kept[chain.first].from), k});
    s.angles.push_back(s.exits.back().angle);
    s.angles.push_back(s.entries.back().angle);
  }
  std::sort(s.angles.begin(), s.angles.end());
  double widest = 2 * kPi - (s.angles.back() - s.angles.front());
  double base = s.angles.back() + 0.5 * widest;
  for (std::size_t k = 1; k < s.angles.size(); ++k) {
    const double gap = s.angles[k] - s.angles[k - 1];
    if (gap <= widest) continue;
    widest = gap;
    base = s.angles[k - 1] + 0.5 * gap;
  }
  for (std::vector<Crossing>* crossed : {&s.exits, &s.entries}) {
    for (Crossing& c : *crossed) {
      c.angle -= base;
      while (c.angle < 0) c.angle += 2 * kPi;
      while (c.angle >= 2 * kPi) c.angle -= 2 * kPi;
    }
    std::sort(crossed->begin(), crossed->end(), [](const Crossing& a, const Crossing& b) { return a.angle < b.angle; });
  }
  const std::size_t n = s.chains.size(), shift = contains(piece, rim.at(base)) ? 1 : 0;
  for (std::size_t k = 0; k < n; ++k) {
    const Crossing& entry = s.entries[(k + shift) % n];
    Chain& chain = s.chains[s.exits[k].chain];
    chain.next = entry.chain;
    const double turn = entry.angle - s.exits[k].angle + (k + shift >= n ? 2 * kPi : 0);
    chain.turn = rim.refined(turn, s.kept[chain.first + chain.count - 1].to, s.kept[s.chains[entry.chain].first].from);
  }
}

// Joins the chains along the clip circle. Whatever the order of crossings, the angle of all joints is right but for
// whole turns, so less than half a turn is beyond doubt; only a small circle can lie in the region but for a notch.
void join_chains(Scratch& s, const Circle& half_space, const Piece& piece, Loops& loops) {
  const Rim rim(half_space);
  const double total = link_nearest(s, rim);
  if (total > kPi || (half_space.d != 0 && total * half_space.radius < kNotch)) link_in_order(s, rim, piece);
  for (Chain& chain : s.chains) chain.used = false;
  for (std::size_t head = 0; head < s.chains.size(); ++head) {
    if (s.chains[head].used) continue;
    Loop& loop = loops.add();
    std::size_t current = head;
    do {
      Chain& chain = s.chains[current];
      chain.used = true;
      loop.insert(loop.end(), s.kept.begin() + chain.first, s.kept.begin() + chain.first + chain.count);
      rim.add_arcs(loop.back().to, s.kept[s.chains[chain.next].first].from, chain.turn, loop);
      current = chain.next;
    } while (current != head);
  }
}

// No edge crosses the circle: the region holds all of it or none. When all edges are on one side, the middle of the
// other side tells, which no edge comes near; only a ring around the circle needs a point of the circle itself.
void add_whole_circle(const Piece& piece, const Circle& half_space, Piece& out) {
  if (piece.loops.empty()) return;
  const bool all = out.loops.size() == piece.loops.size(), none = out.loops.empty();
  if ((all && half_space.d >= 0) || (none && half_space.d <= 0)) return;  // the other side is no less than a hemisphere
  // A boundary around the circle is no shorter than the circle, within a hemisphere: cells far smaller than the circle
  // are not asked where a point is that rounding could misplace.
  double length = 0;
  for (const Loop& loop : piece.loops) {
    for (const Arc& arc : loop) length += arc.length();
  }
  if (length < 2 * kPi * half_space.radius * (1 - 1e-9)) return;
  const Rim rim(half_space);
  const Vec3 probe = all ? -half_space.n : none ? half_space.n : rim.at(0);
  if (!contains(piece, probe)) return;
  const Vec3 start = rim.at(0);
  out.loops.emplace_back();
  rim.add_arcs(start, start, 2 * kPi, out.loops.back());
}

// The plain case, most by far: one loop that leaves the half-space once and comes back once, with no vertex near the
// clip circle and no edge that might dip through it; or lies on one side of a great circle, which it cannot be around.
// Returns false, with `out` in any state, when it is not that plain.
bool clip_plainly(const Piece& piece, const Circle& half_space, Piece& out) {
  constexpr std::size_t kMost = 12;
  if (piece.loops.size() != 1 || piece.loops.front().size() > kMost) return false;
  const Loop& loop = piece.loops.front();
  const std::size_t n = loop.size();
  std::array<double, kMost> h;
  for (std::size_t k = 0; k < n; ++k) {
    h[k] = height(half_space, loop[k].from);
    if (std::abs(h[k]) <= kOnCircle * half_space.radius) return false;
  }
  std::size_t entry = n, exit = n;
  for (std::size_t k = 0; k < n; ++k) {
    const double from = h[k], to = h[k + 1 == n ? 0 : k + 1];
    if ((from > 0) != (to > 0)) {
      std::size_t& crossing = from > 0 ? exit : entry;
      if (crossing != n) return false;
      crossing = k;
    } else if (std::min(std::abs(from), std::abs(to)) <= loop[k].circle.radius * loop[k].dtheta * loop[k].dtheta / 8) {
      return false;
    }
  }
  if (entry == n) {
    if (half_space.d != 0) return false;
    if (h[0] > 0) {
      out = piece;
    } else {
      out.loops.clear();
    }
    return true;
  }
  const auto meet = [&](const Arc& arc) {
    return crossings(arc.dtheta > 0 ? arc.circle : arc.circle.reversed(), half_space);
  };
  const Arc &in = loop[entry], &last = loop[exit];
  const Vec3 enters = within(in, meet(in).entering), leaves = within(last, meet(last).leaving);
  const Vec3 a = leaves - half_space.d * half_space.n, b = enters - half_space.d * half_space.n;
  const double chord = norm(enters - leaves);
  if (!(chord > 64 * kOnCircle) || dot(half_space.n, cross(a, b)) <= 0 || dot(a, b) <= 0) return false;
  out.loops.resize(1);
  Loop& result = out.loops.front();
  result.clear();
  const double first = part_angle(in.circle, enters, in.to, in.dtheta);
  if (first != 0) result.push_back({enters, in.to, in.circle, first});
  for (std::size_t k = entry + 1 == n ? 0 : entry + 1; k != exit; k = k + 1 == n ? 0 : k + 1) result.push_back(loop[k]);
  const double rest = part_angle(last.circle, last.from, leaves, last.dtheta);
  if (rest != 0) result.push_back({last.from, leaves, last.circle, rest});
  result.push_back({leaves, enters, half_space, 2 * std::asin(std::min(1.0, 0.5 * chord / half_space.radius))});
  return true;
}

}  // namespace

void clip(const Piece& piece, const Circle& half_space, Piece& out) {
  if (clip_plainly(piece, half_space, out)) return;
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
    if (crossed && !s.chains.empty()) join_chains(s, half_space, piece, loops);
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
      const double along = dot(a, b);
      // An edge through the antipode has no angle, seen from the point; a region under a hemisphere holds but one of
      // them.
      if (std::abs(left) < kAntipode && along < kAntipode && dot(p, arc.from + arc.to) < -0.9) return false;
      turned += std::atan2(left, along);
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
