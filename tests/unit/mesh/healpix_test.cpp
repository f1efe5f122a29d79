// Laws of HEALPix meshes: equal areas, orders of numbering checked by where centres lie, shared bits, mixed levels.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <numbers>
#include <random>
#include <set>
#include <tuple>

#include "windrow/base/error.h"
#include "windrow/base/exact_sum.h"
#include "windrow/mesh/mesh.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using mesh::Earth;
using mesh::HealpixCell;

namespace {

constexpr double kPi = std::numbers::pi;
constexpr double kWgs84_e2 = 0.00669437999014;

std::uint64_t count(int level) { return std::uint64_t{12} << (2 * level); }
double cell_area(int level) { return 4 * kPi / static_cast<double>(count(level)); }

std::vector<HealpixCell> all_cells(int level) {
  std::vector<HealpixCell> cells;
  for (std::uint64_t n = 0; n < count(level); ++n) cells.push_back({level, n});
  return cells;
}
mesh::MeshPtr healpix(std::vector<HealpixCell> cells) {
  return mesh::make_healpix(std::move(cells), 0, Earth::sphere(6371007), "test");
}
double total(const mesh::Mesh& m) {
  ExactSum sum;
  for (std::size_t k = 0; k < m.size(); ++k) sum.add(m.area(k));
  return sum.value();
}
// Cells replaced by their four children now and then, down to `deepest`.
std::vector<HealpixCell> mixed_cells(int deepest, std::mt19937& random) {
  std::vector<HealpixCell> open = all_cells(0), done;
  while (!open.empty()) {
    const HealpixCell cell = open.back();
    open.pop_back();
    if (cell.level < deepest && (cell.level == 0 || random() % 5 < 2)) {
      for (std::uint64_t k = 0; k < 4; ++k) open.push_back({cell.level + 1, 4 * cell.nested + k});
    } else {
      done.push_back(cell);
    }
  }
  std::shuffle(done.begin(), done.end(), random);
  return done;
}
sphere::Loop sides(const mesh::Mesh& m, std::size_t k) { return m.cell(k).pieces.front().loops.front(); }
using Bits = std::tuple<double, double, double, double, double, double, double, double, double, double, double>;
Bits bits_of(const sphere::Arc& a) {
  return {a.from.x,     a.from.y,     a.from.z,     a.to.x,     a.to.y,  a.to.z,
          a.circle.n.x, a.circle.n.y, a.circle.n.z, a.circle.d, a.dtheta};
}
// Arcs that do not appear exactly twice, once each way.
std::size_t unmatched_arcs(const mesh::Mesh& m) {
  std::map<Bits, int> balance;
  for (std::size_t k = 0; k < m.size(); ++k) {
    for (const sphere::Arc& arc : sides(m, k)) {
      if (arc.dtheta > 0) {
        ++balance[bits_of(arc)];
      } else {
        --balance[bits_of(arc.reversed())];
      }
    }
  }
  return static_cast<std::size_t>(std::count_if(balance.begin(), balance.end(), [](auto& b) { return b.second != 0; }));
}

}  // namespace

TEST_CASE("cells of one HEALPix level have one area and add up to 4 pi") {
  for (int level = 0; level <= 5; ++level) {
    CAPTURE(level);
    const mesh::MeshPtr m = healpix(all_cells(level));
    REQUIRE(m->size() == count(level));
    double worst = 0;
    for (std::size_t k = 0; k < m->size(); ++k) {
      worst = std::max(worst, std::abs(m->area(k) / cell_area(level) - 1));
    }
    CAPTURE(worst);
    CHECK(worst < 1e-9);
    CHECK(std::abs(total(*m) / (4 * kPi) - 1) < 1e-12);
  }
}

TEST_CASE("the sides of fine HEALPix cells follow the boundary as closely as those of coarse ones") {
  // Around the pole, at the belt's edge and on the equator, a few cells of deep levels.
  for (const int level : {9, 13, 17}) {
    CAPTURE(level);
    std::vector<HealpixCell> cells;
    const std::uint64_t per_face = count(level) / 12;
    for (std::uint64_t k = 0; k < 40; ++k) {
      cells.push_back({level, per_face - 1 - k});                    // from the north pole down
      cells.push_back({level, 4 * per_face + per_face / 3 + k});     // on the belt
      cells.push_back({level, 9 * per_face + k * (per_face / 64)});  // from the south pole up
    }
    const mesh::MeshPtr m = healpix(cells);
    double worst = 0;
    for (std::size_t k = 0; k < m->size(); ++k) {
      worst = std::max(worst, std::abs(m->area(k) / cell_area(level) - 1));
    }
    CAPTURE(worst);
    CHECK(worst < 1e-9);
  }
}

TEST_CASE("the first HEALPix cell lies where CF says, on the sphere and on WGS84") {
  // CF 1.13, appendix F, HEALPix: level 0 index 0 is centred at 45 E and 41.810 N on a sphere, 41.938 N on WGS84.
  const GeoPoint on_sphere = healpix(all_cells(0))->centre(0);
  CHECK(on_sphere.longitude.degrees() == doctest::Approx(45).epsilon(1e-14));
  CHECK(std::abs(on_sphere.latitude.degrees() - 41.810) < 5e-4);
  CHECK(std::abs(std::sin(on_sphere.latitude.radians()) - 2.0 / 3) < 1e-15);
  const Earth wgs84 = Earth::ellipsoid(6378137, 298.257223563);
  const mesh::MeshPtr m = mesh::make_healpix(all_cells(0), wgs84.e2, wgs84, "test");
  CHECK(std::abs(m->centre(0).latitude.degrees() - 41.938) < 5e-4);
  CHECK(m->area(0) == healpix(all_cells(0))->area(0));
}

TEST_CASE("latitudes of a file on an ellipsoid are geodetic ones on another earth") {
  // A WGS84 file on a sphere: corners move north or south by the difference of geodetic and authalic latitude, and
  // areas with them, but the whole stays the sphere.
  const mesh::MeshPtr m = mesh::make_healpix(all_cells(2), kWgs84_e2, Earth::sphere(6371007), "test");
  CHECK(std::abs(total(*m) / (4 * kPi) - 1) < 1e-12);
  CHECK(unmatched_arcs(*m) == 0);
  double northernmost = 0, expected = mesh::geodetic_latitude_deg(std::asin(2.0 / 3) / kPi * 180, kWgs84_e2);
  for (const sphere::Arc& arc : sides(*m, 0)) {
    northernmost = std::max(northernmost, arc.from.z);
  }
  CHECK(m->area(4 * 16) != doctest::Approx(cell_area(2)).epsilon(1e-6));
  // The southernmost cell of base cell 0 touches the belt's middle at 0 N; the eastern corner of the level-0 cell lies
  // at z = 2/3 of the file.
  const mesh::MeshPtr base = mesh::make_healpix({{0, 0}}, kWgs84_e2, Earth::sphere(6371007), "test");
  double off = 1;
  for (const sphere::Arc& arc : sides(*base, 0)) {
    off = std::min(off, std::abs(arc.from.z - std::sin(expected / 180 * kPi)));
  }
  CHECK(off < 1e-15);
  CHECK(northernmost > 0);
  for (std::size_t k = 0; k < m->size(); ++k) CHECK(m->find(m->centre(k)) == k);
}

TEST_CASE("ring numbers go from north to south and, along a parallel, from Greenwich to the east") {
  for (int level = 0; level <= 3; ++level) {
    CAPTURE(level);
    const std::vector<HealpixCell> cells = all_cells(level);
    const mesh::MeshPtr m = healpix(cells);
    std::vector<std::size_t> order(m->size());
    for (std::size_t k = 0; k < order.size(); ++k) order[k] = k;
    std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
      const GeoPoint p = m->centre(a), q = m->centre(b);
      if (std::abs(p.latitude.radians() - q.latitude.radians()) > 1e-9) return p.latitude > q.latitude;
      return p.longitude < q.longitude;
    });
    for (std::uint64_t ring = 0; ring < order.size(); ++ring) {
      CHECK(mesh::healpix_from_ring(level, ring, "test") == cells[order[ring]]);
    }
  }
}

TEST_CASE("ring numbers of deep levels are taken once each, in order of latitude") {
  std::mt19937_64 random(20050405);
  for (const int level : {8, 16, 29}) {
    std::set<std::uint64_t> rings;
    while (rings.size() < 800) {
      const std::uint64_t ring = random() % (count(level) - 1);
      rings.insert({ring, ring + 1});
    }
    std::vector<HealpixCell> cells;
    for (const std::uint64_t ring : rings) cells.push_back(mesh::healpix_from_ring(level, ring, "test"));
    const mesh::MeshPtr m = healpix(cells);  // refuses a cell that comes twice
    for (std::size_t k = 0; k + 1 < cells.size(); ++k) {
      const GeoPoint p = m->centre(k), q = m->centre(k + 1);
      const double south = q.latitude.radians() - p.latitude.radians();
      CHECK(south < 1e-12);
      if (std::abs(south) < 1e-12 && level < 20) CHECK(p.longitude < q.longitude);
    }
  }
}

TEST_CASE(
    "nested numbers grow by quarters: a cell's centre lies in its parent, children are south, east, west, north") {
  const mesh::MeshPtr coarse = healpix(all_cells(2)), fine = healpix(all_cells(3));
  for (std::size_t k = 0; k < fine->size(); ++k) CHECK(coarse->find(fine->centre(k)) == k / 4);
  for (std::size_t k = 0; k < coarse->size(); ++k) {
    CHECK(fine->centre(4 * k).latitude < fine->centre(4 * k + 1).latitude);
    CHECK(fine->centre(4 * k + 2).latitude < fine->centre(4 * k + 3).latitude);
    const double turn = fine->centre(4 * k + 1).longitude.degrees() - fine->centre(4 * k + 2).longitude.degrees();
    CHECK(std::sin(turn / 180 * kPi) > 0);
  }
}

TEST_CASE("nuniq and zuniq give back the level and the nested number they were made from") {
  std::mt19937_64 random(1);
  for (int level = 0; level <= 29; ++level) {
    std::vector<std::uint64_t> some = {0, count(level) - 1};
    for (int k = 0; k < 50; ++k) some.push_back(random() % count(level));
    for (const std::uint64_t nested : some) {
      const HealpixCell cell{level, nested};
      // CF 1.13, appendix F: nuniq = nested + 4^(1 + level), zuniq = (2 nested + 1) * 4^(29 - level).
      std::uint64_t four = 1, rest = 1;
      for (int k = 0; k <= level; ++k) four *= 4;
      for (int k = level; k < 29; ++k) rest *= 4;
      CHECK(mesh::healpix_from_nuniq(nested + four, "test") == cell);
      CHECK(mesh::healpix_from_zuniq((2 * nested + 1) * rest, "test") == cell);
    }
  }
}

TEST_CASE("neighbouring HEALPix cells share their arcs to the bit") {
  for (int level = 0; level <= 4; ++level) {
    CAPTURE(level);
    CHECK(unmatched_arcs(*healpix(all_cells(level))) == 0);
  }
}

TEST_CASE("HEALPix cells of mixed levels close up: equal areas by level, shared arcs, 4 pi") {
  std::mt19937 random(759);
  for (int round = 0; round < 5; ++round) {
    const std::vector<HealpixCell> cells = mixed_cells(5, random);
    CAPTURE(round);
    CAPTURE(cells.size());
    const mesh::MeshPtr m = healpix(cells);
    CHECK(unmatched_arcs(*m) == 0);
    CHECK(std::abs(total(*m) / (4 * kPi) - 1) < 1e-12);
    std::size_t lost = 0;
    double worst = 0;
    for (std::size_t k = 0; k < cells.size(); ++k) {
      worst = std::max(worst, std::abs(m->area(k) / cell_area(cells[k].level) - 1));
      if (m->find(m->centre(k)) != k) ++lost;
      if (m->on_rim(k)) ++lost;
    }
    CAPTURE(worst);
    CHECK(worst < 1e-9);
    CHECK(lost == 0);
  }
}

TEST_CASE("a point finds the HEALPix cell whose region contains it") {
  std::mt19937 random(11);
  std::uniform_real_distribution<double> lambda(-180, 540), z(-1, 1);
  const std::vector<HealpixCell> mixed = mixed_cells(4, random);
  std::vector<HealpixCell> some;
  std::copy_if(mixed.begin(), mixed.end(), std::back_inserter(some), [&](const HealpixCell&) { return random() % 2; });
  std::vector<HealpixCell> turned = all_cells(3);
  std::reverse(turned.begin(), turned.end());
  for (const mesh::MeshPtr& m : {healpix(turned), healpix(mixed), healpix(some)}) {
    std::size_t wrong = 0;
    for (int k = 0; k < 300; ++k) {
      const GeoPoint p{Angle::degrees(lambda(random)), Angle::radians(std::asin(z(random)))};
      const std::optional<std::size_t> found = m->find(p);
      if (found && !contains(m->cell(*found).pieces.front(), sphere::point(p))) ++wrong;
      if (!found) {
        for (std::size_t c = 0; c < m->size(); ++c) wrong += contains(m->cell(c).pieces.front(), sphere::point(p));
      }
    }
    CHECK(wrong == 0);
    for (std::size_t k = 0; k < m->size(); ++k) CHECK(m->find(m->centre(k)) == k);
  }
}

TEST_CASE("a point on HEALPix edges belongs to the lowest-numbered of the cells that meet there") {
  const int level = 2;
  std::mt19937 random(5);
  std::vector<HealpixCell> cells = all_cells(level);
  std::shuffle(cells.begin(), cells.end(), random);
  const mesh::MeshPtr m = healpix(cells);
  std::map<std::tuple<double, double, double>, std::size_t> lowest;
  for (std::size_t k = m->size(); k-- > 0;) {
    for (const sphere::Arc& arc : sides(*m, k)) {
      lowest[{arc.from.x, arc.from.y, arc.from.z}] = k;
    }
  }
  for (const auto& [at, cell] : lowest) {
    const double x = std::get<0>(at), y = std::get<1>(at), z = std::get<2>(at);
    const GeoPoint p{Angle::radians(std::atan2(y, x)), Angle::radians(std::atan2(z, std::hypot(x, y)))};
    CAPTURE(x);
    CAPTURE(y);
    CAPTURE(z);
    CHECK(m->find(p) == cell);
  }
}

TEST_CASE("the rim of some HEALPix cells are those with a neighbour missing") {
  // All but one cell of level 2: its four neighbours across a side are the rim.
  for (const std::uint64_t missing : {std::uint64_t{15}, std::uint64_t{70}, std::uint64_t{3}, std::uint64_t{191}}) {
    std::vector<HealpixCell> cells = all_cells(2);
    cells.erase(cells.begin() + static_cast<std::ptrdiff_t>(missing));
    const mesh::MeshPtr m = healpix(cells), hole = healpix({{2, missing}});
    std::set<Bits> around;
    for (const sphere::Arc& arc : sides(*hole, 0)) {
      around.insert(bits_of(arc.dtheta > 0 ? arc : arc.reversed()));
    }
    std::size_t on_rim = 0;
    for (std::size_t k = 0; k < m->size(); ++k) {
      bool touches = false;
      for (const sphere::Arc& arc : sides(*m, k)) {
        touches = touches || around.count(bits_of(arc.dtheta > 0 ? arc : arc.reversed())) > 0;
      }
      CHECK(m->on_rim(k) == touches);
      on_rim += m->on_rim(k);
    }
    CHECK(on_rim == 4);
  }
}

TEST_CASE("HEALPix numbers that do not exist and cells over each other are refused") {
  const auto message = [](auto&& make) -> std::string {
    try {
      make();
    } catch (const Error& e) {
      CHECK(e.kind() == Failure::data);
      return e.what();
    }
    return "accepted";
  };
  CHECK(message([] { mesh::healpix_from_ring(1, 48, "a.nc"); }) ==
        "a.nc: HEALPix cell 48 of level 1, expected 0 to 47");
  CHECK(message([] { mesh::healpix_from_ring(30, 0, "a.nc"); }) == "a.nc: HEALPix level 30, expected 0 to 29");
  CHECK(message([] { mesh::healpix_from_nuniq(3, "a.nc"); }) ==
        "a.nc: HEALPix number 3 in the indexing nuniq, expected 4 to 4611686018427387903");
  CHECK(message([] { mesh::healpix_from_nuniq(std::uint64_t{1} << 62, "a.nc"); }) != "accepted");
  CHECK(message([] { mesh::healpix_from_zuniq(2, "a.nc"); }) ==
        "a.nc: 2 is no HEALPix number in the indexing zuniq, which is (2 nested + 1) * 4^(29 - level)");
  CHECK(message([] { mesh::healpix_from_zuniq(0, "a.nc"); }) != "accepted");
  CHECK(message([] { mesh::healpix_from_zuniq(~std::uint64_t{0}, "a.nc"); }) != "accepted");
  CHECK(message([] { healpix({}); }) == "test: no HEALPix cells, expected at least one");
  CHECK(message([] { healpix({{1, 48}}); }) == "test: HEALPix cell 48 of level 1, expected 0 to 47");
  CHECK(message([] { healpix({{1, 4}, {1, 7}, {1, 4}}); }) == "test: HEALPix cell 4 of level 1 is given twice");
  CHECK(message([] {
          healpix({{3, 70}, {1, 4}});
        }) == "test: HEALPix cell 70 of level 3 and cell 4 of level 1 lie over each other");
}

TEST_CASE("digests of HEALPix meshes tell cells, their order, file and earth apart") {
  std::vector<HealpixCell> turned = all_cells(1);
  std::reverse(turned.begin(), turned.end());
  const mesh::MeshPtr a = healpix(all_cells(1));
  CHECK(a->digest() == healpix(all_cells(1))->digest());
  CHECK(a->digest() != healpix(turned)->digest());
  CHECK(a->digest() != healpix(all_cells(2))->digest());
  const Earth wgs84 = Earth::ellipsoid(6378137, 298.257223563);
  CHECK(a->digest() != mesh::make_healpix(all_cells(1), wgs84.e2, wgs84, "test")->digest());
  CHECK(a->describe() == "HEALPix, level 1, 48 cells, global");
}
