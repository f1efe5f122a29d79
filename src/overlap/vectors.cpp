// Vectors: a scalar map carried over to Cartesian components, and the axes results are taken along.
#include <fmt/format.h>

#include "windrow/base/error.h"
#include "windrow/overlap/methods.h"

namespace windrow::overlap {

using linear_map::LinearMap;
using sphere::Vec3;

namespace {

double component(const Vec3& v, std::size_t k) { return k == 0 ? v.x : (k == 1 ? v.y : v.z); }

}  // namespace

// A pairing of share s becomes three of share s / 3 and factor 3 * axis component: the weights add up to s, the
// products to s times the component along the axis. Increments carry no weight: their shares stay, the factor is the
// component.
LinearMap vector_map(const LinearMap& scalar, const std::vector<Vec3>& axis) {
  if (axis.size() != scalar.rows()) {
    throw Error(Failure::defect, "vector map",
                fmt::format("{} axes for {} rows, expected one a row", axis.size(), scalar.rows()));
  }
  const std::size_t cells = scalar.value_columns, increments = scalar.columns - cells;
  LinearMap map;
  map.quantity = scalar.quantity;
  map.columns = 3 * scalar.columns;
  map.value_columns = 3 * cells;
  map.row_area = scalar.row_area;
  for (int k = 0; k < 3; ++k) {
    map.column_area.insert(map.column_area.end(), scalar.column_area.begin(), scalar.column_area.end());
  }
  map.provenance = scalar.provenance + "; vector components";
  const std::size_t pairings = 3 * scalar.pairings();
  map.column.reserve(pairings);
  map.share.reserve(pairings);
  map.factor.reserve(pairings);
  if (!scalar.cover.empty()) map.cover.reserve(pairings);
  map.row_start.reserve(scalar.row_start.size());
  map.row_start.push_back(0);
  for (std::size_t row = 0; row < scalar.rows(); ++row) {
    const auto first = scalar.row_start[row], last = scalar.row_start[row + 1];
    auto split = first;
    while (split < last && scalar.column[split] < cells) ++split;
    const auto add = [&](std::uint64_t p, std::size_t column, double part, double factor) {
      map.column.push_back(static_cast<std::uint32_t>(column));
      map.share.push_back(scalar.share[p] * part);
      map.factor.push_back(scalar.factor.empty() ? factor : scalar.factor[p] * factor);
      if (!scalar.cover.empty()) map.cover.push_back(scalar.cover[p] * part);
    };
    for (std::size_t k = 0; k < 3; ++k) {
      for (auto p = first; p < split; ++p) {
        add(p, k * cells + scalar.column[p], 1.0 / 3.0, 3 * component(axis[row], k));
      }
    }
    for (std::size_t k = 0; k < 3; ++k) {
      for (auto p = split; p < last; ++p) {
        add(p, 3 * cells + k * increments + (scalar.column[p] - cells), 1, component(axis[row], k));
      }
    }
    map.row_start.push_back(map.column.size());
  }
  return map;
}

// Tangents stand upright on the earth's surface, whose normal is the latitude as given: on an ellipsoid, too, a wind is
// no change of the authalic latitude that areas are reckoned in.
Axes true_axes(const mesh::Mesh& mesh) {
  Axes out;
  out.first.resize(mesh.size());
  out.second.resize(mesh.size());
#pragma omp parallel for schedule(static)
  for (std::size_t k = 0; k < mesh.size(); ++k) {
    const GeoPoint centre = mesh.centre(k);
    // East from the longitude alone: it stays defined where the centre is a pole.
    const auto [sin_lambda, cos_lambda] = sphere::sincos_degrees(centre.longitude.degrees());
    out.first[k] = {-sin_lambda, cos_lambda, 0};
    out.second[k] = cross(sphere::point(centre), out.first[k]);
  }
  return out;
}

Axes grid_axes(const mesh::Mesh& mesh) {
  Axes out;
  out.first.resize(mesh.size());
  out.second.resize(mesh.size());
  for (std::size_t k = 0; k < mesh.size(); ++k) {
    const std::optional<Vec3> x = mesh.x_direction(k);
    if (!x) {
      throw Error(Failure::data, mesh.describe(),
                  "has no direction of growing x, which vector components along the grid refer to");
    }
    out.first[k] = *x;
    out.second[k] = cross(sphere::point(mesh.centre(k)), *x);
  }
  return out;
}

}  // namespace windrow::overlap
