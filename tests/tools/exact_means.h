// Analytic fields on the sphere and their exact cell means by quadrature, for meshes of every kind that the accuracy
// tests use. Shares no code with the engine's geometry: cells are given by their edges, corners or numbers.
#pragma once
#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <numbers>
#include <vector>

#include "../unit/mesh/globe_meshes.h"

namespace windrow::test {

inline constexpr std::size_t kFields = 3;
inline constexpr std::array<const char*, kFields> kFieldNames{"Y2", "Y16", "vortex"};
using FieldValues = std::array<double, kFields>;

/// The fields of Ullrich & Taylor 2015 (MWR, 10.1175/MWR-D-14-00343.1) as polynomials and functions of the Cartesian
/// components, which have no singular point:
///   Y2      2 + cos^2(theta) cos(2 lambda)
///   Y16     2 + sin^16(2 theta) cos(16 lambda)
///   vortex  1 - tanh[(rho / 5) sin(lambda' - 6 omega)], rho = 3 cos(theta'), omega = V / rho (0 where rho = 0),
///           V = (3 sqrt(3) / 2) sech^2(rho) tanh(rho), in a frame whose pole stands at lambda = 0, theta = 0.6 rad
///           (the pole's place is from memory).
inline FieldValues fields_at(const sphere::Vec3& p) {
  const double x2 = p.x * p.x - p.y * p.y, y2 = 2 * p.x * p.y;  // (x + i y)^2, then ^4, ^8, ^16
  const double x4 = x2 * x2 - y2 * y2, y4 = 2 * x2 * y2;
  const double x8 = x4 * x4 - y4 * y4, y8 = 2 * x4 * y4;
  const double x16 = x8 * x8 - y8 * y8;
  const double z2 = 4 * p.z * p.z, z4 = z2 * z2, z8 = z4 * z4;
  static const double c = std::cos(0.6), s = std::sin(0.6);
  const double up = c * p.x + s * p.z;     // sin(theta')
  const double along = s * p.x - c * p.z;  // cos(theta') cos(lambda')
  const double rho = 3 * std::sqrt(std::max(0.0, 1 - up * up));
  const double e = std::exp(-2 * rho);  // tanh(rho) = (1 - e) / (1 + e), sech^2(rho) = 4 e / (1 + e)^2
  const double v = 1.5 * std::sqrt(3.0) * 4 * e * (1 - e) / ((1 + e) * (1 + e) * (1 + e));
  const double omega = rho > 0 ? v / rho : 0;
  const double turned = p.y * std::cos(6 * omega) - along * std::sin(6 * omega);  // cos(theta') sin(lambda' - 6 omega)
  return {2 + x2, 2 + z8 * z8 * x16, 2 / (1 + std::exp(1.2 * turned))};           // 1 - tanh(0.6 turned)
}

/// The same as printed, by angles: what fields_at is checked against.
inline FieldValues fields_as_printed(double lambda, double theta) {
  const double pole = 0.6;
  const double up = std::sin(theta) * std::sin(pole) + std::cos(theta) * std::cos(pole) * std::cos(lambda);
  const double turned =
      std::atan2(std::cos(theta) * std::sin(lambda),
                 std::cos(theta) * std::sin(pole) * std::cos(lambda) - std::cos(pole) * std::sin(theta));
  const double rho = 3 * std::cos(std::asin(up));
  const double v = 3 * std::sqrt(3.0) / 2 / std::pow(std::cosh(rho), 2) * std::tanh(rho);
  const double omega = rho == 0 ? 0 : v / rho;
  return {2 + std::pow(std::cos(theta), 2) * std::cos(2 * lambda),
          2 + std::pow(std::sin(2 * theta), 16) * std::cos(16 * lambda),
          1 - std::tanh(rho / 5 * std::sin(turned - 6 * omega))};
}

/// Nodes and weights of Gauss-Legendre quadrature on 0..1.
struct Gauss {
  explicit Gauss(int n) {
    for (int k = 1; k <= n; ++k) {
      double x = std::cos(std::numbers::pi * (k - 0.25) / (n + 0.5)), slope = 0;
      for (int turn = 0; turn < 20; ++turn) {
        double before = 1, value = x;
        for (int m = 2; m <= n; ++m) {
          const double next = ((2 * m - 1) * x * value - (m - 1) * before) / m;
          before = value;
          value = next;
        }
        slope = n * (x * value - before) / (x * x - 1);
        x -= value / slope;
      }
      node.push_back(0.5 * (1 + x));
      weight.push_back(1 / ((1 - x * x) * slope * slope));
    }
  }
  std::vector<double> node, weight;
};

/// Integrals of the three fields, of the position and of 1 over a cell.
struct Integral {
  FieldValues field{};
  sphere::Vec3 position;
  double area = 0;
  void add(const sphere::Vec3& p, double weight) {
    const FieldValues f = fields_at(p);
    for (std::size_t k = 0; k < kFields; ++k) field[k] += weight * f[k];
    position = position + weight * p;
    area += weight;
  }
};

/// Exact means of every cell of a mesh, as integrals; cells are cut into parts of at most `part` radians to integrate.
class ExactMeans {
 public:
  /// `points` along each side of a part; one less where parts are at most 0.42 of `part`, which is as accurate.
  ExactMeans(int points, double part) : gauss_(points), fewer_(points - 1), part_(part) {}

  /// Cells of a latitude-longitude block, row by row.
  std::vector<Integral> latlon(const std::vector<double>& lon_deg, const std::vector<double>& lat_deg) const {
    constexpr double degree = std::numbers::pi / 180;
    std::vector<Integral> out((lon_deg.size() - 1) * (lat_deg.size() - 1));
#pragma omp parallel for schedule(static)
    for (std::size_t k = 0; k < out.size(); ++k) {
      const std::size_t j = k / (lon_deg.size() - 1), i = k % (lon_deg.size() - 1);
      const double west = lon_deg[i] * degree, south = lat_deg[j] * degree;
      const int nx = parts((lon_deg[i + 1] - lon_deg[i]) * degree), ny = parts((lat_deg[j + 1] - lat_deg[j]) * degree);
      const double dx = (lon_deg[i + 1] - lon_deg[i]) * degree / nx, dy = (lat_deg[j + 1] - lat_deg[j]) * degree / ny;
      for (int part = 0; part < nx * ny; ++part) {
        rectangle(west + dx * (part % nx), south + dy * (part / nx), dx, dy, out[k]);
      }
    }
    return out;
  }

  /// Triangles and convex quadrilaterals between great circles.
  std::vector<Integral> loops(const Loops& cells) const {
    std::vector<Integral> out(cells.loop.size());
#pragma omp parallel for schedule(static)
    for (std::size_t k = 0; k < out.size(); ++k) {
      const auto corner = [&](std::size_t n) { return cells.point[cells.loop[k][n]]; };
      if (cells.loop[k].size() == 3) triangle(corner(0), corner(1), corner(2), out[k]);
      if (cells.loop[k].size() == 4) quadrilateral(corner(0), corner(1), corner(2), corner(3), out[k]);
    }
    return out;
  }

  /// All HEALPix cells of a level in nested order: the means of the finer cells each holds.
  std::vector<Integral> healpix(int level) const {
    const std::uint64_t cells = std::uint64_t{12} << (2 * level);
    int finer = level;
    while (std::sqrt(4 * std::numbers::pi / 12) / std::pow(2.0, finer) > part_) ++finer;
    const std::uint64_t each = std::uint64_t{1} << (2 * (finer - level));
    std::vector<Integral> out(cells);
#pragma omp parallel for schedule(static)
    for (std::uint64_t k = 0; k < cells; ++k) {
      for (std::uint64_t n = 0; n < each; ++n) healpix_cell(finer, k * each + n, out[k]);
    }
    return out;
  }

 private:
  [[nodiscard]] const Gauss& rule(double size) const { return size <= 0.42 * part_ ? fewer_ : gauss_; }
  int parts(double size) const { return std::max(1, static_cast<int>(std::ceil(size / part_))); }

  void rectangle(double west, double south, double dx, double dy, Integral& out) const {
    const Gauss& gauss = rule(std::max(dx, dy));
    const std::size_t n = gauss.node.size();
    for (std::size_t b = 0; b < n; ++b) {
      const double phi = south + dy * gauss.node[b];
      const double c = std::cos(phi), s = std::sin(phi);
      for (std::size_t a = 0; a < n; ++a) {
        const double lambda = west + dx * gauss.node[a];
        out.add({c * std::cos(lambda), c * std::sin(lambda), s}, dx * dy * c * gauss.weight[a] * gauss.weight[b]);
      }
    }
  }

  // The plane triangle under the great-circle triangle, projected outwards: dA = det(a, b, c) / |p|^3 du dv with
  // p = (1 - u) a + u ((1 - v) b + v c) and another factor u (Duffy).
  void triangle(const sphere::Vec3& a, const sphere::Vec3& b, const sphere::Vec3& c, Integral& out) const {
    const double size = std::max({norm(b - a), norm(c - b), norm(a - c)});
    if (size > part_) {
      const sphere::Vec3 ab = unit(a + b), bc = unit(b + c), ca = unit(c + a);
      triangle(a, ab, ca, out);
      triangle(ab, b, bc, out);
      triangle(ca, bc, c, out);
      triangle(ab, bc, ca, out);
      return;
    }
    const double det = dot(a, cross(b - a, c - a));
    const Gauss& gauss = rule(size);
    const std::size_t n = gauss.node.size();
    for (std::size_t i = 0; i < n; ++i) {
      const double u = gauss.node[i];
      for (std::size_t j = 0; j < n; ++j) {
        const sphere::Vec3 p = a + u * ((b - a) + gauss.node[j] * (c - b));
        const double r2 = dot(p, p), r = std::sqrt(r2);
        out.add((1 / r) * p, gauss.weight[i] * gauss.weight[j] * u * det / (r2 * r));
      }
    }
  }

  // The same of a quadrilateral: p = (1 - u) ((1 - v) a + v b) + u ((1 - v) d + v c), dA = p . (p_v x p_u) / |p|^3.
  void quadrilateral(const sphere::Vec3& a, const sphere::Vec3& b, const sphere::Vec3& c, const sphere::Vec3& d,
                     Integral& out) const {
    const double size = std::max({norm(b - a), norm(c - b), norm(d - c), norm(a - d)});
    if (size > part_) {
      const sphere::Vec3 ab = unit(a + b), bc = unit(b + c), cd = unit(c + d), da = unit(d + a);
      const sphere::Vec3 middle = unit(a + b + c + d);
      quadrilateral(a, ab, middle, da, out);
      quadrilateral(ab, b, bc, middle, out);
      quadrilateral(middle, bc, c, cd, out);
      quadrilateral(da, middle, cd, d, out);
      return;
    }
    const Gauss& gauss = rule(size);
    const std::size_t n = gauss.node.size();
    const sphere::Vec3 twist = (c - d) - (b - a);
    for (std::size_t i = 0; i < n; ++i) {
      const double u = gauss.node[i];
      for (std::size_t j = 0; j < n; ++j) {
        const double v = gauss.node[j];
        const sphere::Vec3 p = a + u * (d - a) + v * ((b - a) + u * twist);
        const sphere::Vec3 along_v = (b - a) + u * twist, along_u = (d - a) + v * twist;
        const double r2 = dot(p, p), r = std::sqrt(r2);
        out.add((1 / r) * p, gauss.weight[i] * gauss.weight[j] * dot(p, cross(along_v, along_u)) / (r2 * r));
      }
    }
  }

  // A square of the equal-area plane (Gorski et al. 2005, ApJ 622, 759, section 5), cut along its west-east diagonal,
  // where the projection has its seam; each half is collapsed (Duffy) onto its northern or southern corner, which may
  // be a pole.
  void healpix_cell(int level, std::uint64_t nested, Integral& out) const {
    const std::uint64_t in_face = nested & ((std::uint64_t{1} << (2 * level)) - 1);
    const auto face = static_cast<int>(nested >> (2 * level));
    const double side = std::pow(2.0, -level);
    double x = 0, y = 0;
    for (int bit = 0; bit < level; ++bit) {
      const double digit = std::pow(2.0, bit - level);
      if (in_face >> (2 * bit) & 1) x += digit;
      if (in_face >> (2 * bit + 1) & 1) y += digit;
    }
    // In units of pi/4; the face's southern corner is at (column, row).
    const double column = face < 4 ? 2 * face + 1 : face < 8 ? 2 * (face - 4) : 2 * (face - 8) + 1;
    const double row = face < 4 ? 0 : face < 8 ? -1 : -2;
    const double middle = column + x - y, south = row + x + y;
    const Gauss& gauss = gauss_;  // cells are stretched near the poles: never fewer
    const std::size_t n = gauss.node.size();
    for (const double up : {1.0, -1.0}) {
      const double tip = up > 0 ? south + 2 * side : south;
      for (std::size_t i = 0; i < n; ++i) {
        const double u = gauss.node[i];
        for (std::size_t j = 0; j < n; ++j) {
          const double along = (2 * gauss.node[j] - 1) * side * u;
          // Half of the cell's area is side^2 pi/6; Duffy's factor is 2 u.
          out.add(on_globe(column, middle + along, tip - up * side * u),
                  gauss.weight[i] * gauss.weight[j] * 2 * u * side * side * std::numbers::pi / 6);
        }
      }
    }
  }

  static sphere::Vec3 on_globe(double column, double right, double up) {
    const double from_pole = 2 - std::abs(up);
    double z = up * 2 / 3, lambda = right, c = 0;
    if (from_pole < 1) {
      z = std::copysign(1 - from_pole * from_pole / 3, up);
      c = from_pole * std::sqrt((2 - from_pole * from_pole / 3) / 3);  // sqrt(1 - z^2) without its cancellation
      lambda = column + (right - column) / from_pole;
    } else {
      c = std::sqrt(1 - z * z);
    }
    lambda *= std::numbers::pi / 4;
    return {c * std::cos(lambda), c * std::sin(lambda), z};
  }

  Gauss gauss_, fewer_;
  double part_;
};

}  // namespace windrow::test
