// Geodetic to authalic latitude, so that areas on the unit sphere are areas of the ellipsoid.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "windrow/base/angle.h"
#include "windrow/mesh/projector.h"

namespace windrow::mesh {
namespace {

// q of Snyder 1987 (PP 1395) eq. (3-12); its logarithm is 2 atanh(e sin phi).
double authalic_q(double sin_phi, double e2) {
  const double e = std::sqrt(e2);
  return (1 - e2) * (sin_phi / (1 - e2 * sin_phi * sin_phi) + std::atanh(e * sin_phi) / e);
}

}  // namespace

Earth Earth::sphere(double radius_m) { return {radius_m, 0}; }

Earth Earth::ellipsoid(double semi_major_m, double inverse_flattening) {
  if (inverse_flattening == 0) return sphere(semi_major_m);
  const double f = 1 / inverse_flattening;
  const double e2 = f * (2 - f);
  return {semi_major_m * std::sqrt(authalic_q(1, e2) / 2), e2};  // eq. (3-13)
}

double authalic_latitude_deg(double geodetic_deg, double e2) {
  if (e2 == 0) return geodetic_deg;
  const double q_pole = authalic_q(1, e2);
  const double size = std::abs(geodetic_deg);
  double beta = 0;
  if (size < 45) {
    beta = Angle::radians(std::asin(authalic_q(std::sin(Angle::degrees(size).radians()), e2) / q_pole)).degrees();
  } else {
    // The arcsine of a number near 1 loses half the digits; q(90) - q(phi) and 1 - sin(beta) come from 1 - sin(phi) =
    // 2 sin²(colatitude/2) instead, by subtracting the two terms of (3-12) in closed form.
    const double e = std::sqrt(e2);
    const double half = std::sin(0.5 * Angle::degrees(90 - size).radians());
    const double w = 2 * half * half;
    const double s = 1 - w;
    const double lack = w * (1 + e2 * s) / (1 - e2 * s * s) + (1 - e2) * std::atanh(e * w / (1 - e2 * s)) / e;
    beta = 90 - Angle::radians(2 * std::asin(std::sqrt(0.5 * lack / q_pole))).degrees();
  }
  return std::copysign(beta, geodetic_deg);
}

double geodetic_latitude_deg(double authalic_deg, double e2) {
  // The two differ by about e2 / 2 sin(2 phi) at most: each step gains some two digits.
  double phi = authalic_deg;
  for (int step = 0; step < 60 && e2 != 0; ++step) {
    const double miss = authalic_deg - authalic_latitude_deg(phi, e2);
    phi = std::clamp(phi + miss, -90.0, 90.0);
    if (std::abs(miss) < 1e-14) break;
  }
  return phi;
}

}  // namespace windrow::mesh
