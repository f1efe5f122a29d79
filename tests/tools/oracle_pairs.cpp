// Test tool: overlaps of random pairs of cells against oracles that share no code with windrow.
// Usage: oracle_pairs great-circles COUNT SEED   a general-purpose library of spherical geometry intersects
//        oracle_pairs latlon COUNT SEED          the closed form, in long double
//        oracle_pairs mixed COUNT SEED           prints the pairs for tests/reference/mixed_pairs.py
// Bound: 1e-12 of the cell's area + 8 eps * perimeter, the closure bound of windrow.
#include <omp.h>
#include <s2/s2builderutil_snap_functions.h>
#include <s2/s2loop.h>
#include <s2/s2polygon.h>

#include <cmath>
#include <cstdio>
#include <exception>
#include <limits>
#include <map>
#include <numbers>
#include <stdexcept>

#include "pair_cells.h"
#include "windrow/base/error.h"
#include "windrow/overlap/overlap.h"

namespace {

using namespace windrow;
using test::CellPair;
using test::PairMaker;

using Long = long double;
static_assert(std::numeric_limits<Long>::digits >= 64, "the areas need more digits than double has");
constexpr Long kPi = std::numbers::pi_v<Long>;

double bound(const mesh::Mesh& m) {
  return 1e-12 * m.area(0) + 8 * std::numeric_limits<double>::epsilon() * m.perimeter(0);
}

double overlap_of(const mesh::Mesh& source, const mesh::Mesh& target) try {
  const auto map = overlap::conservative(source, target, linear_map::Quantity::mean).map;
  return map.share.empty() ? 0 : map.share[0] * map.row_area[0];
} catch (const Error& e) {
  std::printf("%s\n", e.what());
  return std::numeric_limits<double>::quiet_NaN();
}

// Differences in units of the bound, the worst of each relation.
class Tally {
 public:
  void add(const std::string& relation, double found, Long exact, const mesh::Mesh& row, const mesh::Mesh& other) {
    const auto difference = static_cast<double>(std::abs(static_cast<Long>(found) - exact));
    const double ratio = difference / bound(row);
    Group& group = groups_[relation];
    ++group.pairs;
    if (exact > 0) ++group.meeting;
    if (!(ratio <= 1)) {
      ++failed_;
      std::printf("FAIL %s: overlap %.17g, oracle %.17Lg, %.3g of the bound; row area %.3g, other %.3g\n",
                  relation.c_str(), found, exact, ratio, row.area(0), other.area(0));
    }
    if (!(ratio <= group.worst)) group.worst = ratio;
  }
  [[nodiscard]] int report() const {
    double worst = 0;
    std::size_t pairs = 0;
    for (const auto& [relation, group] : groups_) {
      std::printf("%-45s %6zu overlaps (%6zu not empty), worst %.3f of the bound\n", relation.c_str(), group.pairs,
                  group.meeting, group.worst);
      if (!(group.worst <= worst)) worst = group.worst;
      pairs += group.pairs;
    }
    std::printf("%zu overlaps, worst %.3f of the bound; %zu fail\n", pairs, worst, failed_);
    return failed_ == 0 ? 0 : 1;
  }

 private:
  struct Group {
    std::size_t pairs = 0, meeting = 0;
    double worst = 0;
  };
  std::map<std::string, Group> groups_;
  std::size_t failed_ = 0;
};

struct Vec {
  Long x, y, z;
};
Vec operator-(const Vec& a, const Vec& b) { return {a.x - b.x, a.y - b.y, a.z - b.z}; }
Long dot(const Vec& a, const Vec& b) { return a.x * b.x + a.y * b.y + a.z * b.z; }
Vec cross(const Vec& a, const Vec& b) { return {a.y * b.z - a.z * b.y, a.z * b.x - a.x * b.z, a.x * b.y - a.y * b.x}; }
Vec direction(const S2Point& p) {
  const Vec v{p.x(), p.y(), p.z()};
  const Long r = std::sqrt(dot(v, v));
  return {v.x / r, v.y / r, v.z / r};
}

// Signed fan of triangles about the first vertex (Van Oosterom & Strackee 1983), in long double.
Long area(const S2Loop& loop) {
  Long sum = 0;
  const Vec a = direction(loop.oriented_vertex(0));
  for (int k = 1; k + 1 < loop.num_vertices(); ++k) {
    const Vec b = direction(loop.oriented_vertex(k)), c = direction(loop.oriented_vertex(k + 1));
    sum += 2 * std::atan2(dot(a, cross(b - a, c - a)), 1 + dot(a, b) + dot(b, c) + dot(c, a));
  }
  return sum;
}
Long area(const S2Polygon& polygon) {
  Long sum = 0;
  for (int k = 0; k < polygon.num_loops(); ++k) sum += area(*polygon.loop(k));
  return sum;
}

S2Polygon polygon_of(const mesh::Mesh& m) {
  std::vector<S2Point> points;
  const sphere::Polygon cell = m.cell(0);
  for (const sphere::Arc& arc : cell.pieces.at(0).loops.at(0)) {
    points.push_back(S2Point(arc.from.x, arc.from.y, arc.from.z).Normalize());
  }
  return S2Polygon(std::make_unique<S2Loop>(points, S2Debug::DISABLE), S2Debug::DISABLE);
}

// The octant and its parts: what the oracle's own areas are worth, double and long double.
void check_oracle() {
  const S2Point x(1, 0, 0), y(0, 1, 0), z(0, 0, 1), xy = (x + y).Normalize();
  const S2Loop octant({x, y, z}), half({x, xy, z});
  const Long off = std::max(std::abs(area(octant) - kPi / 2), std::abs(area(half) - kPi / 4));
  std::printf("the oracle's octant and half of it: off by %.1Le sr (its own areas in double: %.1Le)\n", off,
              std::max(std::abs(octant.GetArea() - kPi / 2), std::abs(half.GetArea() - kPi / 4)));
  if (off > 2e-16L) throw std::runtime_error("the oracle is wrong about a known area");
}

int great_circles(PairMaker& maker, std::size_t count) {
  check_oracle();
  Tally tally;
  Long own_areas = 0;
  for (std::size_t k = 0; k < count; ++k) {
    const CellPair pair = maker.great_circles();
    S2Polygon common;
    S2Error error;
    if (!common.InitToIntersection(polygon_of(*pair.a), polygon_of(*pair.b), s2builderutil::IdentitySnapFunction(),
                                   &error)) {
      throw std::runtime_error("the oracle refuses a pair: " + error.text());
    }
    const Long exact = area(common);
    own_areas = std::max(own_areas, std::abs(common.GetArea() - exact) / bound(*pair.a));
    tally.add(pair.relation, overlap_of(*pair.b, *pair.a), exact, *pair.a, *pair.b);
    tally.add(pair.relation, overlap_of(*pair.a, *pair.b), exact, *pair.b, *pair.a);
  }
  if (maker.refused() > count / 20) throw std::runtime_error("too many cells are refused");
  std::printf("%zu pairs; %zu more refused, their sides cross\n", count, maker.refused());
  std::printf("the oracle's own areas, in double, are off by up to %.3Lg of the bound\n", own_areas);
  return tally.report();
}

Long radians(Long degrees) { return degrees * kPi / 180; }

// Overlap of two intervals of longitude, on all turns, times that of sin(latitude).
Long closed_form(const mesh::LatLonEdges& a, const mesh::LatLonEdges& b) {
  Long width = 0;
  for (int turn = -20; turn <= 20; ++turn) {
    const Long shift = 360.0L * turn;
    const Long west = std::max<Long>(a.lon_deg[0], b.lon_deg[0] + shift);
    const Long east = std::min<Long>(a.lon_deg[1], b.lon_deg[1] + shift);
    width += std::max<Long>(0, east - west);
  }
  const Long south = std::max<Long>(a.lat_deg[0], b.lat_deg[0]), north = std::min<Long>(a.lat_deg[1], b.lat_deg[1]);
  if (!(south < north)) return 0;
  return radians(width) * 2 * std::cos(radians(0.5L * (south + north))) * std::sin(radians(0.5L * (north - south)));
}

int latlon(PairMaker& maker, std::size_t count) {
  Tally tally;
  for (std::size_t k = 0; k < count; ++k) {
    const test::LatLonPair pair = maker.latlon();
    const Long exact = closed_form(pair.a, pair.b);
    const auto a = mesh::make_latlon(pair.a, {}, "cell"), b = mesh::make_latlon(pair.b, {}, "cell");
    const test::Plain plain_a(a), plain_b(b);
    tally.add("cell against cell", overlap_of(plain_b, plain_a), exact, *a, *b);
    tally.add("cell against cell", overlap_of(plain_a, plain_b), exact, *b, *a);
    tally.add("cell against block", overlap_of(*b, plain_a), exact, *a, *b);
    tally.add("block against cell", overlap_of(plain_b, *a), exact, *a, *b);
    tally.add("block against block", overlap_of(*b, *a), exact, *a, *b);
    const mesh::Rotation rotation = maker.rotation();
    const auto turned_a = mesh::make_rotated(pair.a, rotation, {}, "cell");
    const auto turned_b = mesh::make_rotated(pair.b, rotation, {}, "cell");
    tally.add("both turned, cell against cell", overlap_of(test::Plain(turned_b), test::Plain(turned_a)), exact, *a,
              *b);
    tally.add("both turned, cell against block", overlap_of(*turned_b, test::Plain(turned_a)), exact, *a, *b);
  }
  return tally.report();
}

void print(const sphere::Vec3& v) { std::printf("[%.17g,%.17g,%.17g]", v.x, v.y, v.z); }

void print(const mesh::Mesh& m) {
  const sphere::Polygon polygon = m.cell(0);
  std::printf("{\"area\":%.17g,\"perimeter\":%.17g,\"pieces\":[", m.area(0), m.perimeter(0));
  for (std::size_t p = 0; p < polygon.pieces.size(); ++p) {
    std::printf("%s[", p == 0 ? "" : ",");
    for (std::size_t l = 0; l < polygon.pieces[p].loops.size(); ++l) {
      const sphere::Loop& loop = polygon.pieces[p].loops[l];
      for (std::size_t k = 0; k < loop.size(); ++k) {
        std::printf(l + k == 0 ? "[" : ",[");
        print(loop[k].from);
        std::printf(",");
        print(loop[k].to);
        std::printf(",");
        print(loop[k].circle.n);
        std::printf(",%.17g,%.17g]", loop[k].circle.d, loop[k].dtheta);
      }
    }
    std::printf("]");
  }
  std::printf("]}");
}

// One pair a line (JSON): both cells' arcs and what windrow finds, either cell being the row.
int mixed(PairMaker& maker, std::size_t count) {
  for (std::size_t k = 0; k < count; ++k) {
    const CellPair pair = maker.mixed();
    std::printf("{\"relation\":\"%s\",\"overlap\":[%.17g,%.17g],\"cells\":[", pair.relation.c_str(),
                overlap_of(*pair.b, *pair.a), overlap_of(*pair.a, *pair.b));
    print(*pair.a);
    std::printf(",");
    print(*pair.b);
    std::printf("]}\n");
  }
  return 0;
}

}  // namespace

int main(int argc, char** argv) {
  try {
    if (argc != 4) throw std::runtime_error("expected: great-circles|latlon|mixed COUNT SEED");
    omp_set_num_threads(1);  // one cell is no work for several
    const std::string what = argv[1];
    const std::size_t count = std::stoul(argv[2]);
    PairMaker maker(std::stoull(argv[3]));
    if (what == "great-circles") return great_circles(maker, count);
    if (what == "latlon") return latlon(maker, count);
    if (what == "mixed") return mixed(maker, count);
    throw std::runtime_error("unknown kind of pairs: " + what);
  } catch (const std::exception& e) {
    std::fprintf(stderr, "oracle_pairs: %s\n", e.what());
    return 1;
  }
}
