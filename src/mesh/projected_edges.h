// Edges of a projected grid on the globe: corners, and how each edge bends. Building only; the mesh itself is in
// projected.cpp.
#pragma once
#include <cstdint>
#include <map>
#include <string>
#include <vector>

#include "windrow/mesh/mesh.h"

namespace windrow::mesh {

/// Lines of a projected grid on the unit sphere. Edge numbers: `along` edges (j, i)-(j, i + 1) first, j from 0 to ny,
/// then `up` edges (j, i)-(j + 1, i). The canonical direction of an edge is that of growing x or y.
struct ProjectedLines {
  std::size_t nx = 0, ny = 0;
  std::vector<sphere::Vec3> corner;  ///< (ny + 1) * (nx + 1)
  std::vector<double> tilt;          ///< one an edge, see sphere::tilt_through
  /// Edges that one circle does not follow closely enough: 2 * parts - 1 inner points, ends and middles of the parts.
  std::map<std::uint64_t, std::vector<sphere::Vec3>> split;

  [[nodiscard]] std::size_t along_edge(std::size_t j, std::size_t i) const { return j * nx + i; }
  [[nodiscard]] std::size_t up_edge(std::size_t j, std::size_t i) const { return (ny + 1) * nx + j * (nx + 1) + i; }
  [[nodiscard]] std::size_t edges() const { return (ny + 1) * nx + ny * (nx + 1); }
  [[nodiscard]] const sphere::Vec3& at(std::size_t j, std::size_t i) const { return corner[j * (nx + 1) + i]; }
  /// Arcs of an edge in canonical direction, appended; an edge of no length gives none.
  void arcs(std::uint64_t edge, const sphere::Vec3& from, const sphere::Vec3& to, sphere::Loop& out) const;
};

/// Projects corners and midpoints in batches and splits edges until the lens criterion of make_projected holds.
ProjectedLines build_lines(const std::vector<double>& x_edges, const std::vector<double>& y_edges,
                           const Projector& to_geographic, const Earth& earth, const std::string& place);

}  // namespace windrow::mesh
