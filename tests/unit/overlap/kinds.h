// One small mesh of every kind, for laws that hold between any two of them.
#pragma once
#include <limits>
#include <random>
#include <string>

#include "../mesh/azimuthal.h"
#include "../mesh/globe_meshes.h"

namespace windrow::test {

struct Kind {
  std::string name;  ///< short: heads a column of a table
  mesh::MeshPtr mesh;
  bool global = false;
  std::vector<double> bound = {};  ///< of each cell: 1e-12 + 8 eps * perimeter / area
};

inline void set_bounds(Kind& kind) {
  const mesh::Mesh& m = *kind.mesh;
  for (std::size_t k = 0; k < m.size(); ++k) {
    kind.bound.push_back(1e-12 + 8 * std::numeric_limits<double>::epsilon() * m.perimeter(k) / m.area(k));
  }
}

inline mesh::MeshPtr cells_from(const mesh::CellCorners& corners, mesh::Sides sides = mesh::Sides::great_circles) {
  Notices notices;
  return mesh::make_cells(corners, sides, mesh::Earth::sphere(kRadius_m), "cells", notices);
}

/// Gaussian rows with fewer cells towards the poles.
inline mesh::MeshPtr reduced_gaussian(std::size_t rows) {
  const auto lat = mesh::gaussian_edges_deg(rows);
  mesh::CellCorners out;
  out.most = 4;
  for (std::size_t j = 0; j < rows; ++j) {
    const double middle = 0.5 * (lat[j] + lat[j + 1]);
    const auto n =
        static_cast<std::size_t>(std::lround(4 + 2 * static_cast<double>(rows - 2) * std::cos(middle * kDegree)));
    for (std::size_t i = 0; i < n; ++i) {
      const auto edge = [n](std::size_t k) { return 360.0 * static_cast<double>(k % n) / static_cast<double>(n); };
      out.lon_deg.insert(out.lon_deg.end(), {edge(i), edge(i + 1), edge(i + 1), edge(i)});
      out.lat_deg.insert(out.lat_deg.end(), {lat[j], lat[j], lat[j + 1], lat[j + 1]});
      ++out.nx;
    }
  }
  return cells_from(out, mesh::Sides::parallels);
}

/// Quadrilaterals that are nowhere along meridians, over the date line.
inline mesh::MeshPtr tilted(std::size_t ny, std::size_t nx) {
  mesh::CellCorners out;
  out.most = 4;
  out.ny = ny;
  out.nx = nx;
  for (std::size_t k = 0; k < ny * nx; ++k) {
    for (const auto& [dx, dy] : {std::pair(0, 0), std::pair(1, 0), std::pair(1, 1), std::pair(0, 1)}) {
      const double x = static_cast<double>(k % nx) + dx, y = static_cast<double>(k / nx) + dy;
      out.lon_deg.push_back(160 + 2.2 * x - 0.8 * y + 0.02 * x * y);
      out.lat_deg.push_back(20 + 0.6 * x + 1.8 * y + 0.008 * x * x);
    }
  }
  return cells_from(out);
}

/// Two northern poles and a fold between them, corners inferred: elliptic coordinates on a plane that touches the globe
/// at the north pole, x + i y = cosh(u + i v).
inline mesh::MeshPtr folded(std::size_t ny, std::size_t nx) {
  const double step = 2 * std::numbers::pi / static_cast<double>(nx), scale = 0.25;
  std::vector<double> lon, lat;
  for (std::size_t k = 0; k < ny * nx; ++k) {
    const double u = (static_cast<double>(ny - k / nx) - 0.5) * step, v = (static_cast<double>(k % nx) + 0.5) * step;
    const double x = scale * std::cosh(u) * std::cos(v), y = scale * std::sinh(u) * std::sin(v);
    lon.push_back(std::atan2(y, x) / kDegree);
    lat.push_back(90 - 2 * std::atan(0.5 * std::hypot(x, y)) / kDegree);
  }
  return cells_from(mesh::infer_corners(lon, lat, ny, nx, "grid"));
}

inline mesh::MeshPtr healpix_of(int level) {
  std::vector<mesh::HealpixCell> cells;
  for (std::uint64_t k = 0; k < std::uint64_t{12} << (2 * level); ++k) cells.push_back({level, k});
  return mesh::make_healpix(std::move(cells), 0, mesh::Earth::sphere(kRadius_m), "HEALPix");
}

inline mesh::MeshPtr healpix_mixed(int deepest) {
  std::mt19937 random(20260302);
  std::vector<mesh::HealpixCell> open, done;
  for (std::uint64_t k = 0; k < 12; ++k) open.push_back({0, k});
  while (!open.empty()) {
    const mesh::HealpixCell cell = open.back();
    open.pop_back();
    if (cell.level < deepest && (cell.level < 1 || random() % 5 < 2)) {
      for (std::uint64_t k = 0; k < 4; ++k) open.push_back({cell.level + 1, 4 * cell.nested + k});
    } else {
      done.push_back(cell);
    }
  }
  return mesh::make_healpix(std::move(done), 0, mesh::Earth::sphere(kRadius_m), "HEALPix");
}

/// Catchments drawn by hand: one with a hole, one over the date line, one that overlaps others, one near a pole.
inline mesh::MeshPtr catchments() {
  using Ring = mesh::PolygonCell::Ring;
  const Ring wide{{-20, 35}, {5, 33}, {25, 41}, {18, 58}, {-4, 62}, {-15, 50}}, hole{{0, 45}, {8, 44}, {6, 52}};
  const Ring across{{170, 20}, {185, 22}, {195, 35}, {178, 41}}, over{{-5, 40}, {12, 38}, {15, 49}, {2, 55}};
  const Ring north{{30, 70}, {110, 72}, {150, 84}, {60, 86}}, tiny{{10.1, 46.2}, {10.4, 46.1}, {10.3, 46.5}};
  std::vector<mesh::PolygonCell> cells{{{{wide, hole}}}, {{{across}}}, {{{over}}}, {{{north}}}, {{{tiny}}}};
  return mesh::make_polygons(
      std::move(cells), {"wide", "across", "over", "north", "tiny"}, [](std::vector<double>&, std::vector<double>&) {},
      mesh::Earth::sphere(kRadius_m), "degrees", "catchments");
}

/// Two thirds of a mesh's cells, gathered.
inline mesh::MeshPtr gathered(const mesh::MeshPtr& full) {
  std::mt19937 random(20260303);
  std::vector<std::uint32_t> cells;
  for (std::uint32_t k = 0; k < full->size(); ++k) {
    if (random() % 3 > 0) cells.push_back(k);
  }
  return mesh::make_subset(full, std::move(cells));
}

inline std::vector<Kind> source_kinds() {
  const mesh::Earth earth = mesh::Earth::sphere(kRadius_m);
  const auto gaussian =
      mesh::make_latlon({even_edges(-5.625, 11.25, 32), mesh::gaussian_edges_deg(16)}, earth, "Gaussian");
  Notices notices;
  std::vector<Kind> out{
      {"lat-lon", regular(-180, -90, 12, 9, 20, 30), true},
      {"Gaussian", gaussian, true},
      {"regional", regular(-35, 25, 2.5, 2, 20, 28)},
      {"rotated", mesh::make_rotated({even_edges(-20, 2, 20), even_edges(-20, 2, 20)}, {-162, 39.25, 0}, earth, "")},
      {"projected", azimuthal_mesh({10, 48}, 15, 15, 150e3)},
      {"polar", azimuthal_mesh({10, 88}, 9, 9, 450e3, 30e3, 20e3)},
      {"tilted", tilted(15, 14)},
      {"folded", folded(8, 80)},
      {"triangles", mesh::make_faces(faces_of(icosahedral(2)), earth, "faces", notices), true},
      {"hexagons", cells_from(corners_of(dual(icosahedral(2)))), true},
      {"cubed", cells_from(corners_of(cubed(8))), true},
      {"HEALPix", healpix_of(3), true},
      {"mixed", healpix_mixed(3), true},
      {"reduced", reduced_gaussian(16), true},
      {"gathered", gathered(gaussian)}};
  for (Kind& kind : out) set_bounds(kind);
  return out;
}

inline std::vector<Kind> target_kinds() {
  std::vector<Kind> out = source_kinds();
  out.push_back({"polygons", catchments()});
  set_bounds(out.back());
  return out;
}

}  // namespace windrow::test
