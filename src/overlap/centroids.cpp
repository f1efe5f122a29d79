// Centres and true area centroids of cells, with tangent frames.
#include "centres.h"
#include "windrow/overlap/methods.h"
#include "windrow/sphere/area.h"

namespace windrow::overlap {

using sphere::Vec3;

sphere::Vec3 on_sphere(const GeoPoint& point, const mesh::Earth& earth) {
  if (earth.e2 == 0) return sphere::point(point);
  return sphere::point_degrees(point.longitude.degrees(),
                               mesh::authalic_latitude_deg(point.latitude.degrees(), earth.e2));
}

std::vector<Vec3> sphere_centres(const mesh::Mesh& mesh) {
  const mesh::Earth earth = mesh.earth();
  std::vector<Vec3> out(mesh.size());
#pragma omp parallel for schedule(static)
  for (std::size_t k = 0; k < out.size(); ++k) out[k] = on_sphere(mesh.centre(k), earth);
  return out;
}

void tangents(const Vec3& direction, Vec3& first, Vec3& second) {
  const double x = std::abs(direction.x), y = std::abs(direction.y), z = std::abs(direction.z);
  // East and north, but near the poles, where they turn too fast, the frame of another axis.
  const Vec3 axis = z <= 0.99 ? Vec3{0, 0, 1} : (x <= y ? Vec3{1, 0, 0} : Vec3{0, 1, 0});
  first = unit(cross(axis, direction));
  second = cross(direction, first);
}

Centroids centroids(const mesh::Mesh& mesh) {
  const std::size_t cells = mesh.size();
  Centroids out;
  out.direction.resize(cells);
  out.first.resize(cells);
  out.second.resize(cells);
  const mesh::Earth earth = mesh.earth();
#pragma omp parallel
  {
    sphere::Polygon polygon;
#pragma omp for schedule(static)
    for (std::size_t k = 0; k < cells; ++k) {
      mesh.cell_into(k, polygon);
      Vec3 corners;
      for (const sphere::Piece& piece : polygon.pieces) {
        for (const sphere::Arc& arc : piece.loops.front()) corners = corners + arc.from;
      }
      const Vec3 origin = norm(corners) > 0 ? unit(corners) : on_sphere(mesh.centre(k), earth);
      Vec3 sum;
      for (const sphere::Piece& piece : polygon.pieces) sum = sum + sphere::moment(piece, origin);
      // A cell that wraps the globe evenly, or one without area, has no centroid direction of its own.
      out.direction[k] = norm(sum) > 1e-9 * mesh.area(k) ? unit(sum) : on_sphere(mesh.centre(k), earth);
      tangents(out.direction[k], out.first[k], out.second[k]);
    }
  }
  return out;
}

}  // namespace windrow::overlap
