// Meshes from lists: cells by their corners (curvilinear and unstructured grids) and faces of UGRID meshes.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "listed_cells.h"
#include "surface.h"
#include "windrow/base/error.h"

namespace windrow::mesh {
namespace {

constexpr double kOvershoot_deg = 1e-4;  // latitudes that went through single precision exceed 90 by less

using Name = std::function<std::string()>;

void add_point(ListedCells& listed, double lon, double lat, const Earth& earth, const std::string& place,
               const Name& name) {
  if (!std::isfinite(lon) || !(std::abs(lat) <= 90 + kOvershoot_deg)) {
    throw Error(Failure::data, place,
                fmt::format("{} at longitude {}, latitude {} is no place on the globe", name(), lon, lat));
  }
  const double phi = std::clamp(lat, -90.0, 90.0);
  listed.point.push_back(direction_degrees(lon, phi, earth));
  listed.lat_deg.push_back(phi);
}

void check_count(std::size_t found, std::size_t expected, const char* what, const std::string& place) {
  if (found == expected) return;
  throw Error(Failure::data, place, fmt::format("{} {}, expected {}", found, what, expected));
}

// Corners or nodes of one cell: those before the first that is missing; none may follow it.
template <typename Missing>
std::size_t own_count(std::size_t most, Missing&& missing, const std::string& place, const Name& name) {
  std::size_t own = 0;
  while (own < most && !missing(own)) ++own;
  for (std::size_t k = own; k < most; ++k) {
    if (!missing(k)) {
      throw Error(Failure::data, place,
                  fmt::format("{} has a missing corner before others; only its last ones may be missing", name()));
    }
  }
  return own;
}

MeshPtr make_mesh(const ListedCells& listed, std::vector<double> centre_lon, std::vector<double> centre_lat,
                  EdgedTraits traits, const std::string& place, Notices& notices) {
  if (listed.cells() == 0) throw Error(Failure::data, place, "the mesh has no cells");
  if (!centre_lon.empty()) {
    check_count(centre_lon.size(), listed.cells(), "centre longitudes", place);
    check_count(centre_lat.size(), listed.cells(), "centre latitudes", place);
  }
  traits.name = listed.name;
  EdgedCells cells = lay_edges(listed, place, notices);
  cells.centre_lon_deg = std::move(centre_lon);
  cells.centre_lat_deg = std::move(centre_lat);
  return std::make_shared<EdgedMesh>(std::move(cells), std::move(traits), place);
}

}  // namespace

MeshPtr make_cells(CellCorners corners, Sides sides, const Earth& earth, const std::string& place, Notices& notices) {
  if (corners.most < 3)
    throw Error(Failure::data, place, fmt::format("{} corners a cell, expected at least three", corners.most));
  const std::size_t count = corners.lon_deg.size() / corners.most;
  check_count(corners.lon_deg.size(), count * corners.most, "corner longitudes", place);
  check_count(corners.lat_deg.size(), corners.lon_deg.size(), "corner latitudes", place);
  const bool structured = corners.ny > 1;
  if (structured) check_count(count, corners.ny * corners.nx, "cells", place);
  ListedCells listed;
  listed.rounding_deg = corners.rounding_deg;
  listed.sides = sides;
  listed.name = [structured, nx = corners.nx](std::size_t k) {
    return structured ? fmt::format("cell {}, {} (row, column from 0)", k / nx, k % nx)
                      : fmt::format("cell {} (counted from 0)", k);
  };
  for (std::size_t k = 0; k < count; ++k) {
    const double* lon = corners.lon_deg.data() + k * corners.most;
    const double* lat = corners.lat_deg.data() + k * corners.most;
    const std::size_t own = own_count(
        corners.most, [&](std::size_t c) { return std::isnan(lon[c]) || std::isnan(lat[c]); }, place,
        [&] { return listed.name(k); });
    for (std::size_t c = 0; c < own; ++c) {
      listed.corner.push_back(static_cast<std::uint32_t>(listed.point.size()));
      add_point(listed, lon[c], lat[c], earth, place, [&] { return "a corner of " + listed.name(k); });
    }
    listed.cell_start.push_back(listed.corner.size());
  }
  EdgedTraits traits;
  traits.earth = earth;
  traits.kind = "cells";
  if (structured) {
    traits.ny = corners.ny;
    traits.nx = corners.nx;
  }
  const std::string size =
      structured ? fmt::format("curvilinear, {} x {}", corners.ny, corners.nx) : std::to_string(count);
  traits.description = fmt::format("{} cells by their corners, sides along {}", size,
                                   sides == Sides::parallels ? "parallels and great circles" : "great circles");
  return make_mesh(listed, std::move(corners.centre_lon_deg), std::move(corners.centre_lat_deg), std::move(traits),
                   place, notices);
}

MeshPtr make_faces(const FaceNodes& faces, const Earth& earth, const std::string& place, Notices& notices) {
  if (faces.most < 3)
    throw Error(Failure::data, place, fmt::format("{} nodes a face, expected at least three", faces.most));
  const std::size_t count = faces.nodes.size() / faces.most;
  check_count(faces.nodes.size(), count * faces.most, "face nodes", place);
  check_count(faces.lat_deg.size(), faces.lon_deg.size(), "node latitudes", place);
  ListedCells listed;
  listed.name = [](std::size_t k) { return fmt::format("face {} (counted from 0)", k); };
  for (std::size_t k = 0; k < faces.lon_deg.size(); ++k) {
    add_point(listed, faces.lon_deg[k], faces.lat_deg[k], earth, place,
              [k] { return fmt::format("node {} (counted from 0)", k); });
  }
  for (std::size_t k = 0; k < count; ++k) {
    const std::int64_t* nodes = faces.nodes.data() + k * faces.most;
    const std::size_t own = own_count(
        faces.most, [&](std::size_t c) { return nodes[c] == -1; }, place, [&] { return listed.name(k); });
    for (std::size_t c = 0; c < own; ++c) {
      if (nodes[c] < 0 || nodes[c] >= static_cast<std::int64_t>(listed.point.size())) {
        throw Error(Failure::data, place,
                    fmt::format("{} names node {}, but nodes are numbered 0 to {}", listed.name(k), nodes[c],
                                static_cast<std::int64_t>(listed.point.size()) - 1));
      }
      listed.corner.push_back(static_cast<std::uint32_t>(nodes[c]));
    }
    listed.cell_start.push_back(listed.corner.size());
  }
  EdgedTraits traits;
  traits.earth = earth;
  traits.kind = "faces";
  traits.description = fmt::format("{} faces, sides along great circles", count);
  return make_mesh(listed, faces.centre_lon_deg, faces.centre_lat_deg, std::move(traits), place, notices);
}

}  // namespace windrow::mesh
