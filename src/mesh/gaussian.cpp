// Gaussian latitudes (roots of the Legendre polynomial) and the cell edges their quadrature weights imply.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "windrow/base/angle.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {
namespace {

struct Root {
  double sine, weight;
};

// Root k (from the north pole, 0-based) of P_n by Newton's method; weight 2 / ((1 - x²) P_n'(x)²).
Root legendre_root(std::size_t n, std::size_t k) {
  const double count = static_cast<double>(n);
  double x = std::cos(std::numbers::pi * (static_cast<double>(k) + 0.75) / (count + 0.5));
  double slope = 0;
  for (int step = 0; step < 100; ++step) {
    double p = 1;
    double previous = 0;
    for (std::size_t m = 1; m <= n; ++m) {
      const double order = static_cast<double>(m);
      const double next = ((2 * order - 1) * x * p - (order - 1) * previous) / order;
      previous = p;
      p = next;
    }
    slope = count * (x * p - previous) / (x * x - 1);
    const double move = p / slope;
    x -= move;
    if (std::abs(move) < 1e-15) break;
  }
  return {x, 2 / ((1 - x * x) * slope * slope)};
}

}  // namespace

std::vector<double> gaussian_latitudes_deg(std::size_t count) {
  std::vector<double> latitudes(count);
  for (std::size_t k = 0; k < (count + 1) / 2; ++k) {
    const bool equator = 2 * k + 1 == count;
    const double phi = equator ? 0.0 : Angle::radians(std::asin(legendre_root(count, k).sine)).degrees();
    latitudes[count - 1 - k] = phi;
    latitudes[k] = -phi;
  }
  if (count % 2 == 1) latitudes[count / 2] = 0;
  return latitudes;
}

std::vector<double> gaussian_edges_deg(std::size_t count) {
  std::vector<double> weight((count + 1) / 2);
  double hemisphere = 0;
  for (std::size_t k = 0; k < weight.size(); ++k) {
    weight[k] = legendre_root(count, k).weight;
    hemisphere += 2 * k + 1 == count ? weight[k] / 2 : weight[k];
  }
  std::vector<double> edges(count + 1);
  edges.front() = -90;
  edges.back() = 90;
  double from_pole = 0;  // 1 - sin(edge), from which the colatitude comes without loss
  for (std::size_t k = 0; k + 1 < weight.size() || (count % 2 == 1 && k < count / 2); ++k) {
    from_pole += weight[k] / hemisphere;
    const double phi = 90 - Angle::radians(2 * std::asin(std::sqrt(0.5 * from_pole))).degrees();
    edges[count - 1 - k] = phi;
    edges[k + 1] = -phi;
  }
  if (count % 2 == 0 && count > 0) edges[count / 2] = 0;
  return edges;
}

bool is_gaussian(const std::vector<double>& latitudes_deg) {
  constexpr double kTolerance_deg = 2e-4;  // published tables differ by up to 1e-4 in their last digit
  if (latitudes_deg.size() < 2) return false;
  std::vector<double> roots = gaussian_latitudes_deg(latitudes_deg.size());
  if (latitudes_deg.front() > latitudes_deg.back()) std::reverse(roots.begin(), roots.end());
  return std::equal(roots.begin(), roots.end(), latitudes_deg.begin(),
                    [](double root, double given) { return std::abs(root - given) <= kTolerance_deg; });
}

}  // namespace windrow::mesh
