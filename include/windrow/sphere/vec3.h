// Points and directions of 3-D space; points on the globe are unit vectors (x: 0N 0E, y: 0N 90E, z: north pole).
#pragma once
#include <cmath>

#include "windrow/base/angle.h"

namespace windrow::sphere {

struct Vec3 {
  double x = 0, y = 0, z = 0;
  bool operator==(const Vec3&) const = default;
};

constexpr Vec3 operator+(const Vec3& a, const Vec3& b) { return {a.x + b.x, a.y + b.y, a.z + b.z}; }
constexpr Vec3 operator-(const Vec3& a, const Vec3& b) { return {a.x - b.x, a.y - b.y, a.z - b.z}; }
constexpr Vec3 operator-(const Vec3& a) { return {-a.x, -a.y, -a.z}; }
constexpr Vec3 operator*(double s, const Vec3& a) { return {s * a.x, s * a.y, s * a.z}; }
constexpr double dot(const Vec3& a, const Vec3& b) { return a.x * b.x + a.y * b.y + a.z * b.z; }
constexpr Vec3 cross(const Vec3& a, const Vec3& b) {
  return {a.y * b.z - a.z * b.y, a.z * b.x - a.x * b.z, a.x * b.y - a.y * b.x};
}
inline double norm(const Vec3& a) { return std::sqrt(dot(a, a)); }
inline Vec3 unit(const Vec3& a) { return (1.0 / norm(a)) * a; }

/// Sine and cosine of an angle in degrees, reduced exactly first: multiples of 90 are exact, and an angle and the same
/// angle plus 360 (where that sum is exact) give the same bits.
struct SinCos {
  double sin, cos;
};
SinCos sincos_degrees(double degrees);

/// Unit vector of a position in degrees. Latitude +-90 gives the pole exactly.
Vec3 point_degrees(double longitude, double latitude);
inline Vec3 point(const GeoPoint& p) { return point_degrees(p.longitude.degrees(), p.latitude.degrees()); }

}  // namespace windrow::sphere
