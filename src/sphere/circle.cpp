// Construction of points, circles and arcs. Everything that would lose digits near a pole or on a short edge is
// computed from angles and differences here, once.
#include "windrow/sphere/circle.h"

#include <algorithm>

namespace windrow::sphere {

SinCos sincos_degrees(double degrees) {
  const double r = std::fmod(degrees, 360.0);
  // From the nearest multiple of 90, so that the remainder is exact and within 45 degrees, of small negative angles
  // too.
  const int quadrant = static_cast<int>(std::floor(r / 90.0 + 0.5));
  const double rest = Angle::degrees(r - 90.0 * quadrant).radians();
  const double s = std::sin(rest);
  const double c = std::cos(rest);
  switch ((quadrant + 4) % 4) {
    case 0:
      return {s, c};
    case 1:
      return {c, -s};
    case 2:
      return {-s, -c};
    default:
      return {-c, s};
  }
}

Vec3 point_degrees(double longitude, double latitude) {
  const SinCos l = sincos_degrees(longitude);
  const SinCos p = sincos_degrees(latitude);
  return {p.cos * l.cos, p.cos * l.sin, p.sin};
}

Circle Circle::parallel_degrees(double phi) {
  const SinCos p = sincos_degrees(phi);
  const double half_colatitude = Angle::degrees(0.5 * (90.0 - std::abs(phi))).radians();
  const double s = std::sin(half_colatitude);
  return {{0, 0, 1}, p.sin, std::abs(p.cos), 2 * s * s};
}

Circle Circle::meridian_degrees(double lambda) {
  const SinCos l = sincos_degrees(lambda);
  return great({-l.sin, l.cos, 0});
}

double tilt_through(const Vec3& from, const Vec3& middle, const Vec3& to) {
  const Vec3 chord = to - from;
  const double half = 0.5 * norm(chord);
  const Vec3 left = unit(cross(from + to, chord));
  const double offset = dot(left, middle - from);
  const double along = dot(chord, (middle - from) + (middle - to)) / (4 * half);
  // Height of the middle above the chord, as a difference of squares: both terms are near 1 on a short edge.
  const double inside = offset * offset + along * along;
  const double sagitta =
      (half * half - inside) / (std::sqrt(std::max(0.0, 1 - inside)) + std::sqrt(std::max(0.0, 1 - half * half)));
  return offset / sagitta;
}

Arc arc_through(const Vec3& from, const Vec3& to, double tilt) {
  const Vec3 chord = to - from;
  const double half = 0.5 * norm(chord);
  const Vec3 sum = from + to;
  const Vec3 left = unit(cross(sum, chord));
  if (tilt == 0) return {from, to, Circle::great(left), 2 * std::asin(std::min(1.0, half))};
  const double cos_tilt = 1 / std::sqrt(1 + tilt * tilt);
  const double sin_tilt = tilt * cos_tilt;
  const double d = -sin_tilt * std::sqrt(1 - half * half);
  const double radius = std::sqrt(cos_tilt * cos_tilt + sin_tilt * sin_tilt * half * half);
  const Vec3 n = cos_tilt * left - (sin_tilt / norm(sum)) * sum;
  const double dtheta = 2 * std::asin(std::min(1.0, half / radius));
  return {from, to, {n, d, radius, radius * radius / (1 + std::abs(d))}, dtheta};
}

Vec3 point_on(const Arc& arc, double f) {
  const double angle = f * arc.dtheta;
  const Circle& c = arc.circle;
  const Vec3 r = arc.from - c.d * c.n;
  const double s = std::sin(0.5 * angle);
  return arc.from + std::sin(angle) * cross(c.n, r) - (2 * s * s) * r;
}

}  // namespace windrow::sphere
