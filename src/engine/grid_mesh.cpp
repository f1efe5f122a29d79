#include "grid_mesh.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

geo::GridMapping mapping_of(const cf::Grid& grid) {
  geo::GridMapping out;
  for (const cf::Attribute& attribute : grid.mapping) {
    if (attribute.name == "grid_mapping_name") {
      out.name = attribute.text;
    } else if (attribute.numbers.empty()) {
      out.attributes.emplace_back(attribute.name, attribute.text);
    } else if (attribute.numbers.size() == 1) {
      out.attributes.emplace_back(attribute.name, attribute.numbers.front());
    } else {
      out.attributes.emplace_back(attribute.name, attribute.numbers);
    }
  }
  return out;
}

double number_of(const cf::Grid& grid, const std::string& name) {
  const auto found = std::find_if(grid.mapping.begin(), grid.mapping.end(),
                                  [&](const cf::Attribute& a) { return a.name == name && !a.numbers.empty(); });
  return found == grid.mapping.end() ? 0 : found->numbers.front();
}

/// First eccentricity squared of the ellipsoid a mapping names: 0 without one.
double e2_of(const cf::Grid& grid) {
  const double inverse = number_of(grid, "inverse_flattening");
  const double a = number_of(grid, "semi_major_axis"), b = number_of(grid, "semi_minor_axis");
  const double f = inverse > 0 ? 1 / inverse : a > 0 && b > 0 ? 1 - b / a : 0;
  return f * (2 - f);
}

GridMesh projected(const cf::Grid& grid, const mesh::Earth& earth, const std::string& place) {
  GridMesh out;
  out.crs = grid.crs.empty() ? geo::crs_from_mapping(mapping_of(grid), grid.axis_units, place)
                             : geo::crs_with_units(grid.crs, grid.axis_units, place);
  out.mesh = mesh::make_projected(grid.x_edges, grid.y_edges, out.crs->to_geographic, out.crs->from_geographic, earth,
                                  fmt::format("{}, axes in {}", out.crs->wkt, grid.axis_units), place);
  return out;
}

mesh::MeshPtr rotated(const cf::Grid& grid, const mesh::Earth& earth, const std::string& place) {
  if (earth.e2 == 0) return mesh::make_rotated(grid.edges, grid.rotation, earth, place);
  // On an ellipsoid the frame's parallels are no circles.
  const auto& pole = grid.rotation;
  return mesh::make_projected(
      grid.edges.lon_deg, grid.edges.lat_deg, mesh::rotated_projector(pole),
      mesh::geographic_to_rotated_projector(pole), earth,
      fmt::format("rotated pole {} {} {}", pole.pole_lon_deg, pole.pole_lat_deg, pole.north_pole_grid_lon_deg), place);
}

GridMesh whole_mesh(const cf::Grid& grid, const mesh::Earth& earth, const std::string& place, Notices& notices) {
  switch (grid.kind) {
    case cf::GridKind::latlon:
      return {mesh::make_latlon(grid.edges, earth, place), {}};
    case cf::GridKind::rotated:
      return {rotated(grid, earth, place), {}};
    case cf::GridKind::projected:
      return projected(grid, earth, place);
    case cf::GridKind::cells:
      return {mesh::make_cells(grid.corners, grid.sides, earth, place, notices), {}};
    case cf::GridKind::faces:
      return {mesh::make_faces(grid.faces, earth, place, notices), {}};
    case cf::GridKind::healpix:
      return {mesh::make_healpix(grid.healpix, e2_of(grid), earth, place), {}};
    case cf::GridKind::points:
      if (!grid.points.empty() && std::isnan(grid.points.front().latitude.degrees()))
        throw Error(Failure::data, place,
                    fmt::format("is {}; expected values on a grid, with coordinates in degrees_north and degrees_east",
                                grid.how));
      break;
  }
  return {mesh::make_points(grid.points, earth), {}};
}

}  // namespace

GridMesh mesh_of(const cf::Grid& grid, const mesh::Earth& earth, const std::string& place, Notices& notices) {
  GridMesh out = whole_mesh(grid, earth, place, notices);
  if (!grid.subset.empty()) out.mesh = mesh::make_subset(out.mesh, grid.subset);
  return out;
}

cf::GridHints hints_of(const job::GridSpec& spec) {
  return {spec.crs, spec.pole, spec.axis_units, spec.coordinates, spec.sides};
}

}  // namespace windrow::engine
