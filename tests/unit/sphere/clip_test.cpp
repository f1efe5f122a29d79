// Laws of clipping: what is cut off and what is left make up the whole, and neighbours meet in the same points.
#include <doctest/doctest.h>

#include <algorithm>
#include <numbers>
#include <random>

#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using namespace windrow::sphere;

namespace {

constexpr double kPi = std::numbers::pi;
constexpr double kEps = std::numeric_limits<double>::epsilon();

double length(const Piece& p) { return perimeter({{p}}); }

class Nasty {
 public:
  explicit Nasty(unsigned seed) : random_(seed) {}
  double uniform(double low, double high) { return std::uniform_real_distribution<double>(low, high)(random_); }
  bool one_in(int n) { return std::uniform_int_distribution<int>(1, n)(random_) == 1; }
  double log_uniform(double low, double high) { return std::exp(uniform(std::log(low), std::log(high))); }
  Vec3 direction() {
    for (;;) {
      const Vec3 v{uniform(-1, 1), uniform(-1, 1), uniform(-1, 1)};
      if (norm(v) > 0.1 && norm(v) < 1) return unit(v);
    }
  }
  /// A convex-ish quadrilateral of arcs, log-uniform in size, at random places and at poles, some edges bulging.
  Piece quadrilateral() {
    const Vec3 centre = one_in(4) ? Vec3{0, 0, one_in(2) ? 1.0 : -1.0} : direction();
    const double size = log_uniform(1e-5, 0.6);
    const Vec3 u = unit(cross(centre, std::abs(centre.x) < 0.5 ? Vec3{1, 0, 0} : Vec3{0, 1, 0}));
    const Vec3 v = cross(centre, u);
    const double turn = one_in(3) ? 0.0 : uniform(0, kPi / 2);
    std::vector<Vec3> corner;
    for (int k = 0; k < 4; ++k) {
      const double a = turn + k * kPi / 2 + uniform(-0.2, 0.2);
      corner.push_back(unit(centre + size * uniform(0.7, 1.3) * (std::cos(a) * u + std::sin(a) * v)));
    }
    Loop loop;
    for (int k = 0; k < 4; ++k) {
      const double tilt = one_in(3) ? 0.0 : uniform(-0.5, 0.5);
      loop.push_back(arc_through(corner[k], corner[(k + 1) % 4], tilt));
    }
    return {{loop}};
  }
  /// A circle made to pass near, through or along something of the piece.
  Circle circle_at(const Piece& piece) {
    const Loop& loop = piece.loops.front();
    const Arc& arc = loop[std::uniform_int_distribution<std::size_t>(0, loop.size() - 1)(random_)];
    if (one_in(6)) return one_in(2) ? arc.circle : arc.circle.reversed();
    Vec3 p = one_in(3) ? arc.from : point_on(arc, uniform(0, 1));
    if (one_in(3)) p = unit(p + log_uniform(1e-17, 1e-3) * direction());
    Circle c = Circle::great(direction());
    if (one_in(3)) {  // nearly the edge's own circle
      c.n = unit(arc.circle.n + log_uniform(1e-16, 1e-2) * direction());
    }
    c.d = dot(c.n, p);
    if (one_in(5)) {  // tiny circle around
      const double r = log_uniform(1e-5, 0.3);
      c.n = unit(p + r * direction());
      const Vec3 q = p - c.n;
      c.versine = 0.5 * dot(q, q);
      c.d = 1 - c.versine;
      c.radius = std::sqrt(c.versine * (2 - c.versine));
      return one_in(2) ? c : c.reversed();
    }
    c.versine = 1 - std::abs(c.d);
    c.radius = std::sqrt(c.versine * (2 - c.versine));
    return c;
  }

 private:
  std::mt19937_64 random_;
};

}  // namespace

TEST_CASE("what a half-space keeps and what it cuts off make up the whole") {
  Nasty nasty(7031);
  double worst = 0;
  int both = 0;
  for (int k = 0; k < 200000; ++k) {
    const Piece whole = nasty.quadrilateral();
    const Circle c = nasty.circle_at(whole);
    if (c.radius < 1e-9) continue;
    Piece in, out;
    clip(whole, c, in);
    clip(whole, c.reversed(), out);
    const double a = area({{whole}}), a_in = area({{in}}), a_out = area({{out}});
    if (in.loops.size() && out.loops.size()) ++both;
    // Bound of the law: kOnCircle for moved vertices and the same again for each part's own rounding.
    const double ratio = std::abs(a_in + a_out - a) / (kOnCircle * (length(whole) + length(in) + length(out)));
    if (ratio > 1) {
      CAPTURE(k);
      CAPTURE(a);
      CAPTURE(a_in);
      CAPTURE(a_out);
      CHECK(ratio <= 1);
    }
    worst = std::max(worst, ratio);
  }
  CHECK(worst <= 1);
  CHECK(both > 100000);
}

TEST_CASE("wedges at a pole that is nowhere special are cut by meridians and parallels through their own corners") {
  Nasty nasty(4242);
  double worst = 0;
  for (int k = 0; k < 50000; ++k) {
    // A frame turned anyhow: corners and circles are rounded apart.
    const Vec3 z = nasty.direction(), x = unit(cross(z, nasty.direction())), y = cross(z, x);
    const auto turned = [&](const Vec3& v) { return v.x * x + v.y * y + v.z * z; };
    const auto turned_circle = [&](Circle c) {
      c.n = turned(c.n);
      return c;
    };
    const double west = nasty.uniform(-180, 180), east = west + nasty.log_uniform(1e-6, 89), phi = nasty.uniform(1, 89);
    const Vec3 sw = turned(point_degrees(west, phi)), se = turned(point_degrees(east, phi));
    const double down = (90 - phi) / 180 * kPi;
    const Piece whole{{{{sw, se, turned_circle(Circle::parallel_degrees(phi)), (east - west) / 180 * kPi},
                        {se, z, turned_circle(Circle::meridian_degrees(east)), -down},
                        {z, sw, turned_circle(Circle::meridian_degrees(west)), down}}}};
    for (Circle c : {Circle::parallel_degrees(phi), Circle::meridian_degrees(west), Circle::meridian_degrees(east),
                     Circle::meridian_degrees(nasty.uniform(west, east)),
                     Circle::meridian_degrees(west - nasty.log_uniform(1e-6, 89))}) {
      c = turned_circle(c);
      Piece in, out;
      clip(whole, c, in);
      clip(whole, c.reversed(), out);
      const double a = area({{whole}}), a_in = area({{in}}), a_out = area({{out}});
      const double bound = 2 * kOnCircle * (length(whole) + length(in) + length(out));
      worst = std::max({worst, std::abs(a_in + a_out - a) / bound, (a_in - a) / bound, (a_out - a) / bound});
    }
  }
  CHECK(worst <= 1);
}

TEST_CASE("a cell does not hold the antipode of its own corners and edges, rounding or not") {
  Nasty nasty(17);
  for (int k = 0; k < 20000; ++k) {
    const Piece whole = nasty.quadrilateral();
    const Arc& arc = whole.loops[0][static_cast<std::size_t>(k % 4)];
    CHECK_FALSE(contains(whole, -arc.from));
    CHECK_FALSE(contains(whole, unit(-point_on(arc, 0.3) + 1e-16 * nasty.direction())));
  }
}

TEST_CASE("two circles cross in the same bits from either side") {
  Nasty nasty(99);
  for (int k = 0; k < 20000; ++k) {
    const Piece piece = nasty.quadrilateral();
    const Circle a = piece.loops[0][0].circle, b = nasty.circle_at(piece);
    if (a.n == b.n || a.n == -b.n) continue;  // the same or never-meeting circles
    const Crossings one = crossings(a, b), other = crossings(b, a);
    CHECK(one.leaving == other.entering);
    CHECK(one.entering == other.leaving);
    CHECK(crossings(a.reversed(), b).entering == one.leaving);
    CHECK(crossings(a, b.reversed()).entering == one.leaving);
  }
}

TEST_CASE("clipping is symmetric: either half of a cell first gives the same quarter") {
  Nasty nasty(5);
  for (int k = 0; k < 20000; ++k) {
    const Piece whole = nasty.quadrilateral();
    const Circle c1 = nasty.circle_at(whole), c2 = nasty.circle_at(whole);
    if (std::min(c1.radius, c2.radius) < 1e-9) continue;
    Piece one, other, both_one, both_other;
    clip(whole, c1, one);
    clip(one, c2, both_one);
    clip(whole, c2, other);
    clip(other, c1, both_other);
    const double bound = 2 * kOnCircle * (length(whole) + length(one) + length(other));
    CAPTURE(k);
    CHECK(std::abs(area({{both_one}}) - area({{both_other}})) <= bound);
  }
}

TEST_CASE("a cap inside a cell is kept whole, a cell inside a cap too") {
  Loop loop;
  for (int k = 0; k < 4; ++k) {
    loop.push_back(arc_through(point_degrees(90 * k + 10, 80), point_degrees(90 * k + 100, 80), 0));
  }
  const Piece cell{{loop}};
  Piece out;
  clip(cell, Circle::parallel_degrees(89), out);
  const double s = std::sin(kPi / 360);
  CHECK(area({{out}}) == doctest::Approx(4 * kPi * s * s).epsilon(1e-13));
  clip(cell, Circle::parallel_degrees(89).reversed(), out);  // a ring: the cell with a hole
  CHECK(out.loops.size() == 2);
  CHECK(area({{out}}) == doctest::Approx(area({{cell}}) - 4 * kPi * s * s).epsilon(1e-13));
  clip(cell, Circle::parallel_degrees(60), out);
  CHECK(area({{out}}) == area({{cell}}));
  clip(cell, Circle::parallel_degrees(60).reversed(), out);
  CHECK(out.loops.empty());
}

TEST_CASE("a cell beside a shared edge has nothing across it") {
  Loop loop;
  const Vec3 sw = point_degrees(10, 40), se = point_degrees(15, 40), ne = point_degrees(15, 45),
             nw = point_degrees(10, 45);
  const double w = 5 / 180.0 * kPi;
  loop = {{sw, se, Circle::parallel_degrees(40), w},
          {se, ne, Circle::meridian_degrees(15), -w},
          {ne, nw, Circle::parallel_degrees(45), -w},
          {nw, sw, Circle::meridian_degrees(10), w}};
  const Piece cell{{loop}};
  Piece out;
  for (const Circle& c : {Circle::parallel_degrees(45), Circle::parallel_degrees(40).reversed(),
                          Circle::meridian_degrees(15), Circle::meridian_degrees(10).reversed()}) {
    clip(cell, c, out);
    CHECK(std::abs(area({{out}})) <= 8 * kEps * length(cell));
    clip(cell, c.reversed(), out);
    CHECK(area({{out}}) == area({{cell}}));
  }
}

TEST_CASE("a point is inside the cell around it and outside its neighbours, lenses included") {
  const Arc bulge = arc_through(point_degrees(0, 50), point_degrees(60, 50), 0);
  Loop loop = {bulge, arc_through(bulge.to, point_degrees(30, 80), 0),
               arc_through(point_degrees(30, 80), bulge.from, 0)};
  CHECK(contains({{loop}}, point_degrees(30, 60)));
  CHECK_FALSE(contains({{loop}}, point_degrees(30, 52)));  // the great circle rises to 54 degrees
  CHECK_FALSE(contains({{loop}}, point_degrees(-150, -60)));
  loop[0] = {bulge.from, bulge.to, Circle::parallel_degrees(50), kPi / 3};
  CHECK(contains({{loop}}, point_degrees(30, 52)));
  CHECK_FALSE(contains({{loop}}, point_degrees(30, 49.9)));
}
