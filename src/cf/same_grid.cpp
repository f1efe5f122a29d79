// Comparing the records of two grids, kind by kind.
#include "same_grid.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace windrow::cf {

namespace {

/// Share of a cell by which edges may differ (one file's coordinates rounded otherwise than another's).
constexpr double kEdgeShare = 1e-4;
/// Numbers of a grid mapping that differ by this share are the same, written with other digits.
constexpr double kMappingShare = 1e-6;

bool same_edges(const std::vector<double>& a, const std::vector<double>& b) {
  if (a.size() != b.size()) return false;
  for (std::size_t i = 0; i < a.size(); ++i) {
    const double width = i > 0 ? a[i] - a[i - 1] : a[1] - a[0];
    if (std::abs(a[i] - b[i]) > kEdgeShare * width) return false;
  }
  return true;
}

/// Both missing, or within `near`; of longitudes whole turns do not count.
bool same_degrees(const std::vector<double>& a, const std::vector<double>& b, double near, bool longitude) {
  if (a.size() != b.size()) return false;
  for (std::size_t i = 0; i < a.size(); ++i) {
    if (std::isnan(a[i]) != std::isnan(b[i])) return false;
    const double off = longitude ? std::remainder(a[i] - b[i], 360) : a[i] - b[i];
    if (std::abs(off) > near) return false;
  }
  return true;
}

/// The mapping's name and those of its numbers that both files give.
bool same_mapping(const std::vector<Attribute>& a, const std::vector<Attribute>& b) {
  for (const Attribute& one : a) {
    const auto other = std::ranges::find(b, one.name, &Attribute::name);
    if (other == b.end()) continue;
    if (one.name == "grid_mapping_name" && one.text != other->text) return false;
    if (one.numbers.size() != other->numbers.size()) return false;
    for (std::size_t i = 0; i < one.numbers.size(); ++i)
      if (std::abs(one.numbers[i] - other->numbers[i]) > kMappingShare * std::max(1.0, std::abs(one.numbers[i])))
        return false;
  }
  return true;
}

bool same_corners(const mesh::CellCorners& a, const mesh::CellCorners& b) {
  if (a.most != b.most || a.ny != b.ny || a.nx != b.nx) return false;
  const double near = 2 * std::max({a.rounding_deg, b.rounding_deg, 1e-6});
  // Within a metre of a pole longitude means nothing; there the latitudes alone decide.
  if (!same_degrees(a.lat_deg, b.lat_deg, near, false) || a.lon_deg.size() != b.lon_deg.size()) return false;
  for (std::size_t i = 0; i < a.lon_deg.size(); ++i) {
    const double off = std::remainder(a.lon_deg[i] - b.lon_deg[i], 360) * std::cos(a.lat_deg[i] * M_PI / 180);
    if (std::abs(off) > near || std::isnan(a.lon_deg[i]) != std::isnan(b.lon_deg[i])) return false;
  }
  return true;
}

bool same_points(const std::vector<GeoPoint>& a, const std::vector<GeoPoint>& b) {
  return std::ranges::equal(a, b, [](const GeoPoint& p, const GeoPoint& q) {
    return std::abs(p.latitude.degrees() - q.latitude.degrees()) <= 2e-4 &&
           std::abs(std::remainder(p.longitude.degrees() - q.longitude.degrees(), 360)) <= 2e-4;
  });
}

bool same(const Grid& a, const Grid& b) {
  if (a.kind != b.kind || a.subset != b.subset) return false;
  switch (a.kind) {
    case GridKind::latlon:
      return same_edges(a.edges.lon_deg, b.edges.lon_deg) && same_edges(a.edges.lat_deg, b.edges.lat_deg);
    case GridKind::rotated:
      return same_edges(a.edges.lon_deg, b.edges.lon_deg) && same_edges(a.edges.lat_deg, b.edges.lat_deg) &&
             std::abs(a.rotation.pole_lat_deg - b.rotation.pole_lat_deg) < 1e-5 &&
             std::abs(std::remainder(a.rotation.pole_lon_deg - b.rotation.pole_lon_deg, 360)) < 1e-5 &&
             std::abs(std::remainder(a.rotation.north_pole_grid_lon_deg - b.rotation.north_pole_grid_lon_deg, 360)) <
                 1e-5;
    case GridKind::projected:
      return same_edges(a.x_edges, b.x_edges) && same_edges(a.y_edges, b.y_edges) && a.axis_units == b.axis_units &&
             a.crs == b.crs && same_mapping(a.mapping, b.mapping);
    case GridKind::cells:
      return a.sides == b.sides && same_corners(a.corners, b.corners);
    case GridKind::faces:
      return a.faces.most == b.faces.most && a.faces.nodes == b.faces.nodes &&
             same_degrees(a.faces.lon_deg, b.faces.lon_deg, 2e-4, true) &&
             same_degrees(a.faces.lat_deg, b.faces.lat_deg, 2e-4, false);
    case GridKind::healpix:
      return a.healpix == b.healpix && same_mapping(a.mapping, b.mapping);
    case GridKind::points:
      return same_points(a.points, b.points);
  }
  return false;
}

}  // namespace

std::string grid_difference(const Grid& first, const Grid& other) {
  if (same(first, other)) return {};
  return fmt::format("the grid is another ({} against {})", other.how, first.how);
}

}  // namespace windrow::cf
