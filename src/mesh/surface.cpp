// Directions, positions and tangents; latitudes change their kind here and nowhere else.
#include "surface.h"

#include <cmath>

namespace windrow::mesh {
namespace {

using sphere::Vec3;

// On the ellipsoid of semi-major axis 1.
Vec3 surface_point(const GeoPoint& position, double e2) {
  const Vec3 normal = sphere::point(position);
  const double across = 1 / std::sqrt(1 - e2 * normal.z * normal.z);
  return across * Vec3{normal.x, normal.y, (1 - e2) * normal.z};
}

}  // namespace

Vec3 direction_degrees(double longitude, double latitude, const Earth& earth) {
  return sphere::point_degrees(longitude, authalic_latitude_deg(latitude, earth.e2));
}

Vec3 direction_of(const GeoPoint& position, const Earth& earth) {
  return direction_degrees(position.longitude.degrees(), position.latitude.degrees(), earth);
}

GeoPoint position_of(const Vec3& direction, const Earth& earth) {
  const Angle latitude = Angle::radians(std::atan2(direction.z, std::hypot(direction.x, direction.y)));
  const Angle longitude = Angle::radians(std::atan2(direction.y, direction.x));
  if (earth.e2 == 0) return {longitude, latitude};
  return {longitude, Angle::degrees(geodetic_latitude_deg(latitude.degrees(), earth.e2))};
}

std::optional<Vec3> tangent_between(const GeoPoint& from, const GeoPoint& to, const GeoPoint& at, const Earth& earth) {
  const Vec3 normal = sphere::point(at);
  const Vec3 line = surface_point(to, earth.e2) - surface_point(from, earth.e2);
  Vec3 along = line - dot(line, normal) * normal;
  const double length = norm(along);
  if (!(length > 1e-12 * norm(line)) || !(length > 0)) return {};
  along = (1 / length) * along;
  return unit(along - dot(along, normal) * normal);
}

}  // namespace windrow::mesh
