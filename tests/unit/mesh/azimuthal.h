// An equal-area projection of the sphere written for the tests: Lambert azimuthal, Snyder 1987 (USGS PP 1395), forward
// eqs (22-4), (22-5), (24-2); inverse eqs (20-14), (20-15), (20-18), (24-16).
#pragma once
#include <cmath>
#include <vector>

#include "windrow/mesh/mesh.h"

namespace windrow::test {

inline constexpr double kRadius_m = 6371007.1809;
inline constexpr double kDegree = 0.017453292519943295;

struct Azimuthal {
  double lambda0_deg, phi1_deg;

  void to_geographic(std::vector<double>& x, std::vector<double>& y) const {
    const double s1 = std::sin(phi1_deg * kDegree), c1 = std::cos(phi1_deg * kDegree);
    for (std::size_t k = 0; k < x.size(); ++k) {
      const double rho = std::hypot(x[k], y[k]);
      if (rho > 2 * kRadius_m) {
        x[k] = y[k] = std::nan("");
        continue;
      }
      const double c = 2 * std::asin(rho / (2 * kRadius_m));
      const double sc = std::sin(c), cc = std::cos(c);
      const double sin_phi = rho == 0 ? s1 : cc * s1 + y[k] * sc * c1 / rho;
      // cos(phi) from the same triangle, so that latitudes near the pole keep their digits.
      const double east = rho == 0 ? 0 : x[k] * sc / rho;
      const double north = rho == 0 ? c1 : cc * c1 - y[k] * sc * s1 / rho;
      const double lambda = lambda0_deg + std::atan2(east, north) / kDegree;
      y[k] = std::atan2(sin_phi, std::hypot(east, north)) / kDegree;
      x[k] = lambda;
    }
  }
  void from_geographic(std::vector<double>& lon, std::vector<double>& lat) const {
    const double s1 = std::sin(phi1_deg * kDegree), c1 = std::cos(phi1_deg * kDegree);
    for (std::size_t k = 0; k < lon.size(); ++k) {
      const double d = (lon[k] - lambda0_deg) * kDegree;
      const double s = std::sin(lat[k] * kDegree), c = std::cos(lat[k] * kDegree);
      const double scale = kRadius_m * std::sqrt(2 / (1 + s1 * s + c1 * c * std::cos(d)));
      lon[k] = scale * c * std::sin(d);
      lat[k] = scale * (c1 * s - s1 * c * std::cos(d));
    }
  }
};

inline std::vector<double> even_edges(double first, double step, std::size_t cells) {
  std::vector<double> edges;
  for (std::size_t k = 0; k <= cells; ++k) edges.push_back(first + step * static_cast<double>(k));
  return edges;
}

/// ny x nx square cells of `size_m`, the middle of the mesh `east_m`, `north_m` from the projection's centre.
inline mesh::MeshPtr azimuthal_mesh(const Azimuthal& p, std::size_t ny, std::size_t nx, double size_m,
                                    double east_m = 0, double north_m = 0) {
  const double x0 = east_m - 0.5 * size_m * static_cast<double>(nx);
  const double y0 = north_m - 0.5 * size_m * static_cast<double>(ny);
  return mesh::make_projected(
      even_edges(x0, size_m, nx), even_edges(y0, size_m, ny),
      [p](std::vector<double>& x, std::vector<double>& y) { p.to_geographic(x, y); },
      [p](std::vector<double>& x, std::vector<double>& y) { p.from_geographic(x, y); }, mesh::Earth::sphere(kRadius_m),
      "azimuthal equal-area", "test mesh");
}

inline mesh::MeshPtr regular(double west, double south, double dlon, double dlat, std::size_t ny, std::size_t nx,
                             const mesh::Earth& earth = mesh::Earth::sphere(kRadius_m)) {
  return mesh::make_latlon({even_edges(west, dlon, nx), even_edges(south, dlat, ny)}, earth, "test grid");
}

}  // namespace windrow::test
