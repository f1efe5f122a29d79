// Laws of cells listed by corners and of faces: they cover the globe once, share bits, and do not care how they are
// listed.
#include <doctest/doctest.h>

#include <random>

#include "azimuthal.h"
#include "globe_meshes.h"
#include "windrow/base/error.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using namespace windrow::test;
using mesh::CellCorners;
using mesh::Earth;
using mesh::Sides;

namespace {

constexpr double kPi = std::numbers::pi;

GeoPoint at(double lambda, double phi) { return {Angle::degrees(lambda), Angle::degrees(phi)}; }

mesh::MeshPtr cells(const CellCorners& corners, Sides sides = Sides::great_circles, const Earth& earth = {}) {
  Notices notices;
  return mesh::make_cells(corners, sides, earth, "cells", notices);
}
std::string refusal(const CellCorners& corners, Sides sides = Sides::great_circles) {
  try {
    cells(corners, sides);
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::data);
    return e.what();
  }
  return "no error";
}

/// ny x nx cells between parallels and meridians, anticlockwise from the south-west.
CellCorners boxes(const std::vector<double>& lon, const std::vector<double>& lat) {
  CellCorners out;
  out.most = 4;
  out.ny = lat.size() - 1;
  out.nx = lon.size() - 1;
  for (std::size_t j = 0; j < out.ny; ++j) {
    for (std::size_t i = 0; i < out.nx; ++i) {
      for (const double l : {lon[i], lon[i + 1], lon[i + 1], lon[i]}) out.lon_deg.push_back(l);
      for (const double p : {lat[j], lat[j], lat[j + 1], lat[j + 1]}) out.lat_deg.push_back(p);
    }
  }
  return out;
}
CellCorners one_cell(std::vector<double> lon, std::vector<double> lat) {
  CellCorners out;
  out.most = lon.size();
  out.nx = 1;
  out.lon_deg = std::move(lon);
  out.lat_deg = std::move(lat);
  return out;
}
/// A curvilinear grid, tilted and bent.
CellCorners bent_grid(std::size_t ny, std::size_t nx) {
  const auto corner = [](std::size_t j, std::size_t i) {
    const double x = static_cast<double>(i), y = static_cast<double>(j);
    return std::pair(170 + 1.1 * x - 0.4 * y + 0.01 * x * y, 40 + 0.3 * x + 0.9 * y + 0.004 * x * x);
  };
  CellCorners out;
  out.most = 4;
  out.ny = ny;
  out.nx = nx;
  for (std::size_t j = 0; j < ny; ++j) {
    for (std::size_t i = 0; i < nx; ++i) {
      for (const auto& [dj, di] : {std::pair{0, 0}, {0, 1}, {1, 1}, {1, 0}}) {
        const auto [l, p] = corner(j + static_cast<std::size_t>(dj), i + static_cast<std::size_t>(di));
        out.lon_deg.push_back(l);
        out.lat_deg.push_back(p);
      }
    }
  }
  return out;
}
CellCorners turned(CellCorners corners) {  // every cell listed in the other sense
  for (std::size_t k = 0; k < corners.lon_deg.size(); k += corners.most) {
    std::size_t own = 0;
    while (own < corners.most && !std::isnan(corners.lon_deg[k + own])) ++own;
    const auto first = static_cast<std::ptrdiff_t>(k), last = static_cast<std::ptrdiff_t>(k + own);
    std::reverse(corners.lon_deg.begin() + first, corners.lon_deg.begin() + last);
    std::reverse(corners.lat_deg.begin() + first, corners.lat_deg.begin() + last);
  }
  return corners;
}
std::size_t rim(const mesh::Mesh& m) {
  std::size_t count = 0;
  for (std::size_t k = 0; k < m.size(); ++k) count += m.on_rim(k) ? 1 : 0;
  return count;
}

}  // namespace

TEST_CASE("meshes of triangles, quadrilaterals, hexagons and pentagons cover the globe once and share every side") {
  struct Kind {
    const char* name;
    Loops loops;
    std::size_t sides;
  };
  const std::vector<Kind> kinds = {{"icosahedron", icosahedral(0), 3},
                                   {"triangles", icosahedral(4), 3},
                                   {"cube", cubed(1), 4},
                                   {"cubed", cubed(12), 4},
                                   {"hexagons", dual(icosahedral(3)), 6},
                                   {"dodecahedron", dual(icosahedral(0)), 5}};
  for (const Kind& kind : kinds) {
    CAPTURE(kind.name);
    Notices notices;
    const auto m = mesh::make_cells(corners_of(kind.loops), Sides::great_circles, {}, "cells", notices);
    const auto faces = mesh::make_faces(faces_of(kind.loops), {}, "faces", notices);
    CHECK(notices.list().empty());
    for (const auto& mesh : {m, faces}) {
      CHECK(mesh->size() == kind.loops.loop.size());
      CHECK(std::abs(total_area(*mesh) / (4 * kPi) - 1) < 1e-12);
      CHECK(unmatched_arcs(*mesh) == 0);
      CHECK(rim(*mesh) == 0);
      CHECK(mesh->cell(mesh->size() / 2).pieces[0].loops[0].size() == kind.sides);
      CHECK(mesh->shape() == std::pair<std::size_t, std::size_t>(1, mesh->size()));
    }
    for (std::size_t k = 0; k < m->size(); ++k) {
      CHECK(std::abs(m->area(k) / faces->area(k) - 1) < 1e-11);
      CHECK(m->area(k) == sphere::area(m->cell(k)));
      CHECK(m->perimeter(k) == sphere::perimeter(m->cell(k)));
    }
  }
}

TEST_CASE("a regular solid has equal faces") {
  for (const Loops& solid : {icosahedral(0), dual(icosahedral(0)), cubed(1)}) {
    const auto m = cells(corners_of(solid));
    for (std::size_t k = 0; k < m->size(); ++k) {
      CHECK(m->area(k) == doctest::Approx(4 * kPi / static_cast<double>(m->size())).epsilon(1e-14));
    }
  }
}

TEST_CASE("cells between parallels have the area of the closed form") {
  struct Size {
    double degrees, tolerance;
  };
  for (const Size s :
       {Size{30, 1e-14}, {15, 1e-14}, {10, 1e-14}, {5, 1e-14}, {1, 1e-13}, {0.1, 1e-12}, {0.009, 1e-11}}) {
    CAPTURE(s.degrees);
    for (const double south : {-90.0, -75.0, -30.0, 0.0, 45.0, 60.0}) {
      CAPTURE(south);
      const auto grid = boxes(even_edges(100, s.degrees, 3), even_edges(south, s.degrees, 1));
      const auto m = cells(grid, Sides::parallels);
      const auto plain = regular(100, south, s.degrees, s.degrees, 1, 3);
      for (std::size_t k = 0; k < m->size(); ++k) {
        const double exact = s.degrees * kDegree * 2 * std::cos((south + 0.5 * s.degrees) * kDegree) *
                             std::sin(0.5 * s.degrees * kDegree);
        CHECK(std::abs(m->area(k) / exact - 1) < s.tolerance);
        CHECK(std::abs(sphere::area(plain->cell(k)) / exact - 1) < s.tolerance);
      }
    }
  }
}

TEST_CASE("a whole latitude-longitude grid by its corners is that grid") {
  const auto edges = boxes(even_edges(-180, 5, 72), even_edges(-90, 4.5, 40));
  for (const Earth& earth : {Earth{}, Earth::ellipsoid(6378137, 298.257223563)}) {
    const auto m = cells(edges, Sides::parallels, earth);
    const auto plain = regular(-180, -90, 5, 4.5, 40, 72, earth);
    CHECK(std::abs(total_area(*m) / (4 * kPi) - 1) < 1e-12);
    CHECK(unmatched_arcs(*m) == 0);
    CHECK(rim(*m) == 0);
    CHECK(m->shape() == plain->shape());
    for (std::size_t k = 0; k < m->size(); k += 13) {
      CHECK(std::abs(m->area(k) / plain->area(k) - 1) < 1e-13);
      CHECK(m->find(plain->centre(k)) == k);
      const bool pole = k < 72 || k >= 39 * 72;
      CHECK(m->cell(k).pieces[0].loops[0].size() == (pole ? 3 : 4));
      const auto x = m->x_direction(k);
      REQUIRE(x);
      if (!pole) CHECK(norm(*x - *plain->x_direction(k)) < 1e-3);
    }
    // Sides along great circles bulge towards the poles: areas differ, but still add up.
    const auto great = cells(edges, Sides::great_circles, earth);
    CHECK(std::abs(total_area(*great) / (4 * kPi) - 1) < 1e-12);
    CHECK(std::abs(great->area(72 * 35) / plain->area(72 * 35) - 1) > 1e-4);
  }
}

TEST_CASE("cells listed clockwise, from another corner, padded or with repeated corners are the same mesh") {
  for (const CellCorners& corners : {bent_grid(7, 9), corners_of(dual(icosahedral(2)))}) {
    const auto m = cells(corners);
    Notices notices;
    const auto clockwise = mesh::make_cells(turned(corners), Sides::great_circles, {}, "cells", notices);
    CHECK(clockwise->digest() == m->digest());
    REQUIRE(notices.list().size() == 1);
    CHECK(notices.list()[0].text == std::to_string(m->size()) + " of " + std::to_string(m->size()) +
                                        " cells list their corners clockwise: taken "
                                        "the other way round");
    CellCorners wide = corners;  // two more places a cell: the last corner once more, and a missing one
    wide.most = corners.most + 2;
    wide.lon_deg.clear();
    wide.lat_deg.clear();
    CellCorners shifted = corners;
    for (std::size_t k = 0; k < m->size(); ++k) {
      std::vector<std::pair<double, double>> own;
      for (std::size_t c = k * corners.most; c < (k + 1) * corners.most; ++c) {
        if (!std::isnan(corners.lon_deg[c])) own.emplace_back(corners.lon_deg[c], corners.lat_deg[c]);
      }
      const std::size_t n = own.size();
      for (std::size_t c = 0; c < n; ++c) {
        const auto& [l, p] = own[(c + 1 + k) % n];
        shifted.lon_deg[k * corners.most + c] = l;
        shifted.lat_deg[k * corners.most + c] = p;
      }
      own.push_back(own.back());
      own.resize(wide.most, {std::nan(""), std::nan("")});
      for (const auto& [l, p] : own) {
        wide.lon_deg.push_back(l);
        wide.lat_deg.push_back(p);
      }
    }
    CHECK(cells(wide)->digest() == m->digest());
    CHECK(cells(shifted)->digest() == m->digest());
  }
  const auto grid = boxes(even_edges(0, 2, 3), even_edges(40, 2, 3));
  CHECK(cells(grid)->digest() != cells(grid, Sides::parallels)->digest());
  CHECK(cells(bent_grid(7, 9))->digest() != cells(bent_grid(7, 8))->digest());
}

TEST_CASE("corners that differ by the rounding of single precision are one") {
  std::mt19937_64 random(3);
  const auto rounded = [&](CellCorners corners) {  // and computed a little differently for every cell
    std::uniform_real_distribution<double> u(-0.5, 0.5);
    for (double& v : corners.lon_deg) v = static_cast<float>(v + 360 + 6e-5 * u(random));
    for (double& v : corners.lat_deg) v = static_cast<float>(std::clamp(v + 1.5e-5 * u(random), -90.0, 90.0));
    corners.rounding_deg = 1e-4;
    return corners;
  };
  struct Case {
    CellCorners corners;
    Sides sides;
    bool global;
  };
  const std::vector<Case> cases = {{corners_of(dual(icosahedral(3))), Sides::great_circles, true},
                                   {corners_of(cubed(20)), Sides::great_circles, true},
                                   {bent_grid(20, 30), Sides::great_circles, false},
                                   {boxes(even_edges(0, 2, 180), even_edges(-90, 2, 90)), Sides::parallels, true}};
  for (const Case& c : cases) {
    const auto exact = cells(c.corners, c.sides);
    const auto m = cells(rounded(c.corners), c.sides);
    CHECK(unmatched_arcs(*m) == unmatched_arcs(*exact));
    CHECK(rim(*m) == rim(*exact));
    if (c.global) CHECK(std::abs(total_area(*m) / (4 * kPi) - 1) < 1e-12);
  }
  // Without the hint that numbers are rounded, they are taken at their word.
  CellCorners strict = rounded(bent_grid(20, 30));
  strict.rounding_deg = 1e-9;
  CHECK(rim(*cells(strict)) == 600);
}

TEST_CASE("distinct corners of small cells stay apart, however coarse the rounding") {
  // 0.0005 degrees (50 m) with a rounding of 1e-4 degrees: only a hundredth of a side may be bridged.
  CellCorners fine = boxes(even_edges(10, 5e-4, 6), even_edges(50, 5e-4, 5));
  fine.rounding_deg = 1e-4;
  const auto m = cells(fine);
  CHECK(m->size() == 30);
  CHECK(rim(*m) == 18);
  CHECK(m->cell(8).pieces[0].loops[0].size() == 4);
}

TEST_CASE("a cell around a pole holds it, a cell at a pole ends there, cells cross the date line") {
  const auto cap = cells(one_cell({0, 90, 180, 270}, {60, 60, 60, 60}), Sides::parallels);
  CHECK(cap->area(0) == doctest::Approx(2 * kPi * (1 - std::sin(kPi / 3))).epsilon(1e-14));
  CHECK(cap->find(at(17, 90)) == 0);
  CHECK(cap->find(at(200, 60.001)) == 0);
  CHECK_FALSE(cap->find(at(200, 59.999)));
  const auto square = cells(one_cell({45, 135, 225, 315}, {-70, -70, -70, -70}));
  CHECK(square->find(at(17, -90)) == 0);
  CHECK(square->area(0) < 2 * kPi * (1 - std::sin(70 * kDegree)));
  const auto sector = cells(one_cell({10, 40, 40, -100}, {80, 80, 90, 90}), Sides::parallels);
  CHECK(sector->cell(0).pieces[0].loops[0].size() == 3);
  CHECK(sector->area(0) == doctest::Approx(30 * kDegree * (1 - std::sin(80 * kDegree))).epsilon(1e-13));
  const auto date_line = cells(one_cell({179, -179, -179, 179}, {-1, -1, 1, 1}));
  CHECK(date_line->find(at(180, 0.5)) == 0);
  CHECK(date_line->find(at(-180, 0.5)) == 0);
  CHECK(std::abs(date_line->centre(0).longitude.degrees()) == doctest::Approx(180));
  // A sector of 120 degrees near the pole: its parallel is longer than a quarter of its circle, and in two arcs.
  const auto wide = cells(one_cell({-60, 60, 0}, {85, 85, 90}), Sides::parallels);
  CHECK(wide->cell(0).pieces[0].loops[0].size() == 4);
  CHECK(wide->area(0) == doctest::Approx(120 * kDegree * (1 - std::sin(85 * kDegree))).epsilon(1e-13));
}

TEST_CASE("concave cells are taken, cells that cross themselves are not") {
  const auto arrow = cells(one_cell({0, 10, 0, 3}, {0, 5, 10, 5}));
  CHECK(arrow->find(at(5, 5)) == 0);
  CHECK_FALSE(arrow->find(at(1, 5)));
  CHECK(refusal(one_cell({0, 10, 0, 10}, {0, 10, 10, 0})) == "cells: cell 0 (counted from 0) crosses itself");
  CHECK(refusal(one_cell({0, 10, 10, 5, 5, 0}, {0, 0, 10, -5, 10, 10})) ==
        "cells: cell 0 (counted from 0) crosses itself");
}

TEST_CASE("impossible cells are refused by number") {
  CellCorners grid = boxes(even_edges(0, 10, 3), even_edges(0, 10, 2));
  std::fill_n(grid.lon_deg.begin() + 16, 4, 5.0);
  std::fill_n(grid.lat_deg.begin() + 16, 4, 5.0);
  CHECK(refusal(grid) == "cells: cell 1, 1 (row, column from 0) has 1 different corners, expected at least three");
  CHECK(refusal(one_cell({0, 100, 100}, {0, 0, 10})) ==
        "cells: cell 0 (counted from 0) has a side of 100 degrees, expected at most 90");
  CHECK(refusal(one_cell({0, 10, 20}, {0, 0, 0})) == "cells: cell 0 (counted from 0) has no area");
  CHECK(refusal(one_cell({0, 10, 20}, {0, 91, 0})) ==
        "cells: a corner of cell 0 (counted from 0) at longitude 10, latitude 91 is no place on the globe");
  CHECK(refusal(one_cell({0, std::nan(""), 20, 30}, {0, std::nan(""), 0, 20})) ==
        "cells: cell 0 (counted from 0) has a missing corner before others; only its last ones may be missing");
  CHECK(refusal(one_cell({0, 180, 90}, {89, 89, 60}), Sides::parallels) ==
        "cells: cell 0 (counted from 0) has a side along half a parallel: both ways round are equally long");
  CellCorners short_of = boxes({0, 1, 2}, {0, 1, 2});
  short_of.nx = 3;
  CHECK(refusal(short_of) == "cells: 4 cells, expected 6");
  Notices notices;
  mesh::FaceNodes faces = faces_of(icosahedral(0));
  faces.nodes[4] = 12;
  CHECK_THROWS_WITH_AS(mesh::make_faces(faces, {}, "faces", notices),
                       "faces: face 1 (counted from 0) names node 12, but nodes are numbered 0 to 11", Error);
}

TEST_CASE("points find the lowest-numbered cell that holds them, on sides and corners too") {
  std::mt19937_64 random(8);
  std::uniform_real_distribution<double> u(-1, 1);
  for (const Loops& loops : {icosahedral(2), dual(icosahedral(2)), cubed(5)}) {
    const auto m = cells(corners_of(loops));
    for (int k = 0; k < 300; ++k) {
      const sphere::Vec3 p = sphere::unit({u(random), u(random), u(random)});
      std::optional<std::size_t> slow;
      for (std::size_t c = m->size(); c-- > 0;) {
        if (contains(m->cell(c).pieces[0], p)) slow = c;
      }
      CHECK(m->find(at(longitude_deg(p), latitude_deg(p))) == slow);
    }
    for (std::size_t c = 0; c < m->size(); ++c) {
      const auto polygon = m->cell(c);
      for (const auto& arc : polygon.pieces[0].loops[0]) {
        for (const sphere::Vec3& p : {arc.from, point_on(arc, 0.37)}) {
          const auto found = m->find(at(longitude_deg(p), latitude_deg(p)));
          REQUIRE(found);
          CHECK(*found <= c);
        }
      }
    }
  }
}

TEST_CASE("every cell's boundary lies within its hull, widened by the margin") {
  const auto check = [](const mesh::Mesh& m) {
    std::size_t hulls = 0;
    std::mt19937_64 random(2);
    std::normal_distribution<double> normal;
    for (std::size_t k = 0; k < m.size(); k += 7) {
      const auto hull = m.hull(k);
      if (!hull) continue;
      ++hulls;
      const auto polygon = m.cell(k);
      for (int direction = 0; direction < 20; ++direction) {
        const sphere::Vec3 n = sphere::unit({normal(random), normal(random), normal(random)});
        double reach = -2, corners = -2;
        for (const auto& arc : polygon.pieces[0].loops[0]) {
          for (int f = 0; f < 8; ++f) reach = std::max(reach, dot(n, point_on(arc, f / 8.0)));
        }
        for (const auto& corner : hull->corner) corners = std::max(corners, dot(n, corner));
        CHECK(reach <= corners + hull->margin);
      }
    }
    return hulls;
  };
  CHECK(check(*cells(corners_of(cubed(20)))) > 300);
  CHECK(check(*cells(corners_of(icosahedral(3)))) > 100);
  CHECK(check(*cells(boxes(even_edges(0, 5, 72), even_edges(-90, 5, 36)), Sides::parallels)) > 300);
}

TEST_CASE("x of a curvilinear grid runs from the left side to the right, whichever corner cells begin with") {
  CellCorners corners = bent_grid(6, 8);
  const auto m = cells(corners), other = cells(turned(corners));
  for (std::size_t k = 0; k < m->size(); ++k) {
    const auto corner = [&](std::size_t c) {
      return sphere::point_degrees(corners.lon_deg[4 * k + c], corners.lat_deg[4 * k + c]);
    };
    const sphere::Vec3 middle = sphere::point(m->centre(k));
    sphere::Vec3 expected = unit(corner(1) + corner(2)) - unit(corner(0) + corner(3));
    expected = unit(expected - dot(expected, middle) * middle);
    REQUIRE(m->x_direction(k));
    CHECK(norm(*m->x_direction(k) - expected) < 1e-9);
    CHECK(norm(*m->x_direction(k) - *other->x_direction(k)) < 1e-12);
    CHECK(std::abs(dot(*m->x_direction(k), middle)) < 1e-15);
  }
  CHECK_FALSE(cells(corners_of(icosahedral(1)))->x_direction(0));
}

TEST_CASE("given centres are kept, others are the mean direction of the corners") {
  CellCorners corners = boxes(even_edges(10, 2, 3), even_edges(20, 2, 2));
  CHECK(cells(corners)->centre(0).longitude.degrees() == doctest::Approx(11));
  corners.centre_lon_deg = {11.1, 13, 15, 11, 13, 15};
  corners.centre_lat_deg = {20.9, 21, 21, 23, 23, 23};
  CHECK(cells(corners)->centre(0).longitude.degrees() == doctest::Approx(11.1).epsilon(1e-15));
  CHECK(cells(corners)->digest() != cells(boxes(even_edges(10, 2, 3), even_edges(20, 2, 2)))->digest());
  // On the ellipsoid, the latitude is the file's kind again.
  const auto m =
      cells(one_cell({-1, 1, 1, -1}, {44, 44, 46, 46}), Sides::parallels, Earth::ellipsoid(6378137, 298.257223563));
  CHECK(m->centre(0).latitude.degrees() == doctest::Approx(45).epsilon(2e-4));
}
