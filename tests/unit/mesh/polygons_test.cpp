// Laws of polygon meshes: closed forms of boxes, holes, the date line, poles and half the globe; shared bits; refusals.
#include <doctest/doctest.h>

#include <cmath>
#include <ctime>
#include <functional>
#include <numbers>
#include <random>
#include <set>
#include <tuple>

#include "azimuthal.h"
#include "windrow/base/error.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using mesh::Earth;
using mesh::PolygonCell;
using Ring = PolygonCell::Ring;

namespace {

constexpr double kPi = std::numbers::pi;
double radians(double degrees) { return degrees / 180 * kPi; }
GeoPoint at(double lambda, double phi) { return {Angle::degrees(lambda), Angle::degrees(phi)}; }
double sine(double degrees) { return std::sin(radians(degrees)); }
// Of a box between meridians and parallels: a closed form.
double box_area(double west, double east, double south, double north) {
  return radians(east - west) * (sine(north) - sine(south));
}
Ring box(double west, double east, double south, double north) {
  return {{west, south}, {east, south}, {east, north}, {west, north}};
}
// Its sides in `parts` pieces each.
Ring fine_box(double west, double east, double south, double north, int parts) {
  const Ring corners = box(west, east, south, north);
  Ring out;
  for (std::size_t c = 0; c < 4; ++c) {
    const auto &a = corners[c], &b = corners[(c + 1) % 4];
    for (int k = 0; k < parts; ++k) {
      const double f = static_cast<double>(k) / parts;
      out.push_back({a[0] + f * (b[0] - a[0]), a[1] + f * (b[1] - a[1])});
    }
  }
  return out;
}
PolygonCell one(Ring outer, std::vector<Ring> holes = {}) {
  std::vector<Ring> rings = {std::move(outer)};
  rings.insert(rings.end(), holes.begin(), holes.end());
  return {{rings}};
}
mesh::MeshPtr polygons(std::vector<PolygonCell> cells, const Earth& earth = Earth::sphere(6371007)) {
  std::vector<std::string> names;
  for (std::size_t k = 0; k < cells.size(); ++k) names.push_back(std::string(1, static_cast<char>('A' + k)));
  return mesh::make_polygons(
      std::move(cells), std::move(names), [](std::vector<double>&, std::vector<double>&) {}, earth, "degrees", "test");
}
double area(PolygonCell cell) { return polygons({std::move(cell)})->area(0); }
using Bits = std::tuple<double, double, double, double, double, double, double, double, double, double, double>;
// Without direction.
std::set<Bits> arcs_of(const mesh::Mesh& m, std::size_t cell) {
  std::set<Bits> out;
  const sphere::Polygon polygon = m.cell(cell);
  for (const sphere::Piece& piece : polygon.pieces) {
    for (const sphere::Loop& loop : piece.loops) {
      for (const sphere::Arc& whole : loop) {
        const sphere::Arc a = whole.dtheta > 0 ? whole : whole.reversed();
        out.insert({a.from.x, a.from.y, a.from.z, a.to.x, a.to.y, a.to.z, a.circle.n.x, a.circle.n.y, a.circle.n.z,
                    a.circle.d, a.dtheta});
      }
    }
  }
  return out;
}
std::string message(const std::function<void()>& make) {
  try {
    make();
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::data);
    return e.what();
  }
  return "accepted";
}

}  // namespace

TEST_CASE("a box in degrees has the area of the closed form, however finely it is drawn and whichever way round") {
  struct Case {
    double west, east, south, north;
  };
  for (const Case& c : {Case{5, 17, 43, 49}, Case{-3, 3, -4, 4}, Case{170, 200, -20, 10}, Case{-10, 60, 60, 85},
                        Case{100, 101, 89, 89.9}, Case{0, 170, -30, 50}, Case{-80, 95, 20, 75}, Case{20, 80, 10, 90}}) {
    CAPTURE(c.west);
    CAPTURE(c.north);
    const double expected = box_area(c.west, c.east, c.south, c.north);
    for (const int parts : {1, 7, 60}) {
      CAPTURE(parts);
      Ring ring = fine_box(c.west, c.east, c.south, c.north, parts);
      CHECK(std::abs(area(one(ring)) / expected - 1) < 1e-10);
      std::reverse(ring.begin(), ring.end());
      CHECK(std::abs(area(one(ring)) / expected - 1) < 1e-10);
      ring.push_back(ring.front());  // closed once more
      CHECK(std::abs(area(one(ring)) / expected - 1) < 1e-10);
    }
  }
}

TEST_CASE("holes subtract, parts add") {
  const double outer = box_area(0, 20, 40, 50);
  const double hole = box_area(5, 8, 42, 45), other = box_area(12, 13, 46, 49);
  CHECK(area(one(box(0, 20, 40, 50), {box(5, 8, 42, 45)})) == doctest::Approx(outer - hole).epsilon(1e-10));
  Ring turned = box(5, 8, 42, 45);
  std::reverse(turned.begin(), turned.end());
  const mesh::MeshPtr m = polygons({one(box(0, 20, 40, 50), {turned, box(12, 13, 46, 49)})});
  CHECK(m->area(0) == doctest::Approx(outer - hole - other).epsilon(1e-10));
  CHECK(m->find(at(6, 43)) == std::nullopt);
  CHECK(m->find(at(9, 43)) == 0);
  PolygonCell islands = one(box(0, 20, 40, 50), {box(5, 8, 42, 45)});
  islands.parts.push_back({box(6, 7, 43, 44)});  // an island in the lake
  CHECK(area(islands) == doctest::Approx(outer - hole + box_area(6, 7, 43, 44)).epsilon(1e-10));
  CHECK(polygons({islands})->find(at(6.5, 43.5)) == 0);
}

TEST_CASE("a region over the date line is one region, in two halves or in longitudes beyond 180") {
  const double expected = box_area(170, 195, -20, -5);
  PolygonCell halves = one(box(170, 180, -20, -5));
  halves.parts.push_back({box(-180, -165, -20, -5)});
  Ring jumping = {{170, -20}, {-165, -20}, {-165, -5}, {170, -5}};
  const mesh::MeshPtr m = polygons({halves, one(box(170, 195, -20, -5)), one(jumping), one(box(-190, -165, -20, -5))});
  for (std::size_t k = 0; k < m->size(); ++k) {
    CHECK(m->area(k) == doctest::Approx(expected).epsilon(1e-10));
    CHECK(std::abs(m->centre(k).longitude.degrees() - -177.5) < 1e-9);
  }
  CHECK(arcs_of(*m, 1) == arcs_of(*m, 2));
  CHECK(arcs_of(*m, 1) == arcs_of(*m, 3));
  for (const double lambda : {171.0, 179.0, 180.0, -180.0, -179.0, -166.0, 181.0, 539.0}) {
    CAPTURE(lambda);
    CHECK(m->find(at(lambda, -10)) == 0);
  }
  CHECK(m->find(at(169, -10)) == std::nullopt);
  CHECK(m->find(at(-164, -10)) == std::nullopt);
}

TEST_CASE("rings that hold a pole, with or without a seam to it") {
  Ring cap;
  for (int k = 0; k < 24; ++k) cap.push_back({-180 + 15.0 * k, 70});
  const double expected = 2 * kPi * (1 - sine(70));
  CHECK(area(one(cap)) == doctest::Approx(expected).epsilon(1e-10));
  std::reverse(cap.begin(), cap.end());
  CHECK(area(one(cap)) == doctest::Approx(expected).epsilon(1e-10));
  // As maps in degrees show it: along the edge of the map to the pole and back.
  Ring seamed = {{-180, -90}, {180, -90}, {180, -70}};
  for (int k = 1; k < 24; ++k) seamed.push_back({180 - 15.0 * k, -70});
  seamed.push_back({-180, -70});
  const mesh::MeshPtr m = polygons({one(seamed), one(cap, {{{0, 80}, {120, 80}, {240, 80}}})});
  CHECK(m->area(0) == doctest::Approx(expected).epsilon(1e-10));
  CHECK(m->find(at(77, -90)) == 0);
  CHECK(m->find(at(180, -80)) == 0);
  CHECK(m->find(at(-33, -69)) == std::nullopt);
  // A hole that holds the pole too.
  CHECK(m->area(1) == doctest::Approx(2 * kPi * (sine(80) - sine(70))).epsilon(1e-10));
  CHECK(m->find(at(10, 90)) == std::nullopt);
  CHECK(m->find(at(10, 75)) == 1);
}

TEST_CASE("wide parts come in pieces that each fit an octant, up to half the globe") {
  struct Case {
    double west, east, south, north;
  };
  for (const Case& c : {Case{0, 180, -90, 90}, Case{-180, 0, -90, 90}, Case{-30, 150, -90, 90}, Case{0, 120, 0, 60},
                        Case{-100, 100, -30, 40}, Case{90, 270, -90, 0}, Case{13, 160, -80, 85}}) {
    CAPTURE(c.west);
    CAPTURE(c.south);
    for (const int parts : {1, 11}) {
      if (c.east - c.west > 180 && parts == 1) continue;  // corners alone would mean the short way
      const mesh::MeshPtr m = polygons({one(fine_box(c.west, c.east, c.south, c.north, parts))});
      const double expected = box_area(c.west, c.east, c.south, c.north);
      CHECK(m->area(0) == doctest::Approx(expected).epsilon(1e-10));
      const sphere::Polygon cell = m->cell(0);
      CHECK(sphere::area(cell) == doctest::Approx(expected).epsilon(1e-10));
      CHECK(cell.pieces.size() > 1);
      for (const sphere::Piece& piece : cell.pieces) CHECK(sphere::signed_area(piece) < kPi / 2 * (1 + 1e-9));
      std::mt19937 random(180);
      std::uniform_real_distribution<double> lambda(-180, 180), phi(-90, 90);
      for (int k = 0; k < 200; ++k) {
        const double l = lambda(random), p = phi(random);
        const double from_west = std::fmod(l - c.west + 720, 360);
        CHECK(m->find(at(l, p)).has_value() == (from_west < c.east - c.west && p > c.south && p < c.north));
      }
    }
  }
  // All round: the seam is no boundary.
  const mesh::MeshPtr band = polygons({one(fine_box(-180, 180, -20, 20, 8)), one(fine_box(0, 360, 0, 90, 8))});
  CHECK(band->area(0) == doctest::Approx(box_area(-180, 180, -20, 20)).epsilon(1e-10));
  CHECK(band->area(1) == doctest::Approx(2 * kPi).epsilon(1e-10));
  CHECK(band->find(at(180, 3)) == 0);
  CHECK(band->find(at(0, 21)) == 1);
}

TEST_CASE("neighbours share their boundary to the bit, whichever way and with whatever turn each is drawn") {
  // The ragged line between two regions, and a region too wide for one piece beside narrow ones.
  Ring line;
  std::mt19937 random(3);
  std::uniform_real_distribution<double> wobble(-0.5, 0.5);
  for (int k = 0; k <= 40; ++k) line.push_back({179 + wobble(random), -10 + 0.5 * k});
  Ring west = line, east;
  west.push_back({170, 10});
  west.push_back({170, -10});
  for (auto p : line) east.push_back({p[0] - 360, p[1]});
  east.push_back({-170, 10});
  east.push_back({-170, -10});
  Ring wide = line;
  wide.push_back({60, 20});
  wide.push_back({60, -70});
  const mesh::MeshPtr m = polygons({one(west), one(east), one(wide)});
  for (const std::size_t other : {std::size_t{1}, std::size_t{2}}) {
    const std::set<Bits> a = arcs_of(*m, 0), b = arcs_of(*m, other);
    std::size_t shared = 0;
    for (const Bits& bits : a) shared += b.count(bits);
    CHECK(shared >= line.size() - 1);
  }
  CHECK(m->cell(2).pieces.size() > 1);
  // 12 lunes and caps that tile the globe.
  std::vector<PolygonCell> cells;
  for (int k = 0; k < 6; ++k) {
    const double w = 7.3 + 60 * k;
    cells.push_back(one({{w, -90}, {w + 60, -90}, {w + 60, 12.5}, {w, 12.5}}));
    cells.push_back(one({{w, 12.5}, {w + 60, 12.5}, {w + 60, 90}, {w, 90}}));
  }
  const mesh::MeshPtr globe = polygons(cells);
  double sum = 0;
  for (std::size_t k = 0; k < globe->size(); ++k) sum += globe->area(k);
  CHECK(std::abs(sum / (4 * kPi) - 1) < 1e-12);
}

TEST_CASE("a point in several polygons, or on the line between two, is found in the lowest-numbered one") {
  const mesh::MeshPtr m = polygons({one(box(10, 20, 0, 10)), one(box(0, 30, -5, 15)), one(box(20, 25, 0, 10))});
  CHECK(m->find(at(15, 5)) == 0);
  CHECK(m->find(at(5, 5)) == 1);
  CHECK(m->find(at(22, 5)) == 1);
  CHECK(m->find(at(20, 5)) == 0);
  CHECK(m->find(at(31, 5)) == std::nullopt);
  for (std::size_t k = 0; k < m->size(); ++k) CHECK(m->on_rim(k));
}

TEST_CASE("polygons of a projection: straight lines there, areas of the projection when it keeps them") {
  // Lambert azimuthal equal-area: the area on the sphere is the map's own, a closed form that shares no code.
  const test::Azimuthal p{10, 52};
  const auto project = [p](std::vector<double>& x, std::vector<double>& y) { p.to_geographic(x, y); };
  const auto mirrored = [p](std::vector<double>& x, std::vector<double>& y) {
    for (double& value : x) value = -value;
    p.to_geographic(x, y);
  };
  const Earth earth = Earth::sphere(test::kRadius_m);
  Ring ring = {{-1e6, -8e5}, {3e5, -1.1e6}, {2.2e6, 4e5}, {1e5, 1.9e6}, {-2e5, 3e5}};
  const Ring hole = {{0, 0}, {3e5, 1e5}, {1e5, 4e5}};
  const auto flat = [](const Ring& r) {
    double sum = 0;
    for (std::size_t k = 0; k < r.size(); ++k) {
      const auto &a = r[k], &b = r[(k + 1) % r.size()];
      sum += 0.5 * (a[0] * b[1] - a[1] * b[0]);
    }
    return std::abs(sum) / (test::kRadius_m * test::kRadius_m);
  };
  for (const mesh::Projector& to_geographic : {mesh::Projector(project), mesh::Projector(mirrored)}) {
    const mesh::MeshPtr m = mesh::make_polygons({one(ring, {hole}), one({{0, 0}, {1, 0}, {0, 1}})}, {"a", "b"},
                                                to_geographic, earth, "laea", "test");
    CHECK(m->area(0) == doctest::Approx(flat(ring) - flat(hole)).epsilon(1e-10));
    CHECK(m->area(1) == doctest::Approx(0.5 / (test::kRadius_m * test::kRadius_m)).epsilon(1e-7));
  }
}

TEST_CASE("polygons that are none are refused by name") {
  CHECK(message([] { polygons({}); }) == "test: no polygons, expected at least one");
  CHECK(message([] {
          polygons({one(box(0, 1, 0, 1)), PolygonCell{}});
        }) == "test: polygon \"B\" is empty, expected at least one part");
  CHECK(message([] { polygons({PolygonCell{{{}}}}); }) == "test: polygon \"A\" has a part without rings");
  for (const Ring& ring : {Ring{}, Ring{{1, 1}}, Ring{{1, 1}, {2, 2}}, Ring{{1, 1}, {2, 2}, {3, 3}},
                           Ring{{1, 1}, {5, 1}, {3, 1}, {9, 1}}, Ring{{0, 90}, {50, 90}, {100, 90}}}) {
    CHECK(message([&] { polygons({one(ring)}); }) == "test: polygon \"A\" has no area");
  }
  CHECK(message([] {
          polygons({one({{0, 0}, {2, 2}, {3, 0}, {0, 2}})});
        }) == "test: polygon \"A\" crosses itself near 1.2, 1.2");
  // Across the date line, at a vertex, and a hole over its outline.
  CHECK(message([] {
          polygons({one({{179, 0}, {-179, 2}, {-178, 0}, {179, 2}})});
        }) == "test: polygon \"A\" crosses itself near 180.2, 1.2");
  CHECK(message([] {
          polygons({one({{0, 0}, {1, 1}, {3, 3}, {3, 0}, {1, 1}, {0, 2}})});
        }) == "test: polygon \"A\" crosses itself near 1, 1");
  // At a vertex that lies on another side.
  CHECK(message([] {
          polygons({one({{0, 0}, {4, 0}, {4, 2}, {2, 0}, {1, -2}, {0, -2}})});
        }) == "test: polygon \"A\" crosses itself near 2, 0");
  CHECK(message([] { polygons({one(box(0, 4, 0, 4), {box(3, 5, 1, 2)})}); }).find("crosses itself near 4, ") !=
        std::string::npos);
  CHECK(message([] { polygons({one(box(0, 4, 0, 4), {box(6, 7, 1, 2)})}); }) ==
        "test: polygon \"A\" has a hole outside its outer ring, at 6, 1");
  CHECK(message([] { polygons({one(fine_box(-100, 100, -90, 90, 9))}); }) ==
        "test: polygon \"A\" covers more than half of the globe in one part, expected smaller parts");
  CHECK(message([] {
          polygons({one({{0, 80}, {10, 91}, {20, 80}})});
        }) == "test: polygon \"A\" has no place on the globe at 10, 91");
  CHECK(message([] {
          polygons({one({{0, 80}, {10, std::nan("")}, {20, 80}})});
        }) == "test: polygon \"A\" has a vertex whose coordinates are no numbers");
}

TEST_CASE("rings that touch themselves, and lines to and fro, are no crossing") {
  // Two squares that meet at a corner, drawn as one ring; a hole that touches the outline; a spur.
  CHECK(area(one({{0, 0}, {1, 0}, {1, 1}, {2, 1}, {2, 2}, {1, 2}, {1, 1}, {0, 1}})) ==
        doctest::Approx(box_area(0, 1, 0, 1) + box_area(1, 2, 1, 2)).epsilon(1e-10));
  CHECK(area(one({{0, 0}, {4, 0}, {4, 2}, {2, 0}, {1, 2}, {0, 2}})) > 0);  // touches its own side from within
  CHECK(area(one({{0, 0}, {4, 0}, {4, 4}, {0, 4}}, {{{4, 0}, {3, 1}, {2, 0.5}}})) > 0);
  CHECK(area(one({{0, 0}, {4, 0}, {4, 4}, {6, 7}, {4, 4}, {0, 4}})) ==
        doctest::Approx(box_area(0, 4, 0, 4)).epsilon(1e-10));
}

TEST_CASE("a polygon of 100 000 vertices is made in about a second") {
  // A coast: bays and capes, each vertex off by about the length of a side; star-shaped, so it crosses nothing.
  std::mt19937 random(100);
  std::uniform_real_distribution<double> wobble(0, 3e-4);
  Ring ring;
  constexpr int kVertices = 100000;
  for (int k = 0; k < kVertices; ++k) {
    const double angle = 2 * kPi * k / kVertices;
    const double r = 3 + 0.3 * std::sin(7 * angle) + 0.02 * std::sin(211 * angle) + wobble(random);
    ring.push_back({178 + r * std::cos(angle), 50 + r * std::sin(angle)});
  }
  const std::clock_t start = std::clock();
  const mesh::MeshPtr m = polygons({one(ring)});
  const double seconds = static_cast<double>(std::clock() - start) / CLOCKS_PER_SEC;  // of all processors together
  MESSAGE("100 000 vertices: ", seconds, " s of processor time");
  CHECK(seconds < 4);  // comparing every pair of sides would take minutes
  CHECK(m->find(at(178, 50)) == 0);
  // Between lines of longitude and latitude, the trapezoids' own integral: sum of -mean(sin phi) dlambda, with the mean
  // of the sine over a straight line in closed form.
  double expected = 0;
  for (int k = 0; k < kVertices; ++k) {
    const auto &a = ring[k], &b = ring[(k + 1) % kVertices];
    const double middle = radians(0.5 * (a[1] + b[1])), half = radians(0.5 * (b[1] - a[1]));
    expected -= radians(b[0] - a[0]) * std::sin(middle) * (half == 0 ? 1 : std::sin(half) / half);
  }
  CHECK(m->area(0) == doctest::Approx(expected).epsilon(1e-10));
}

TEST_CASE("digests of polygons tell shapes, earths and maps apart") {
  const mesh::MeshPtr a = polygons({one(box(0, 1, 0, 1))});
  CHECK(a->digest() == polygons({one(box(0, 1, 0, 1))})->digest());
  CHECK(a->digest() != polygons({one(box(0, 1, 0, 1.0000001))})->digest());
  CHECK(a->digest() != polygons({one(box(0, 1, 0, 1))}, Earth::ellipsoid(6378137, 298.257223563))->digest());
  CHECK(a->describe() == "1 polygon (degrees)");
}
