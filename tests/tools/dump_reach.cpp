// Kriging weights before clipping, the reach map and a fitted variogram of what stands on standard input, all printed:
// for tests/reference/kriging.py, which writes the input and knows its order. Test use only.
#include <cstdio>
#include <exception>
#include <iostream>
#include <stdexcept>
#include <string>
#include <vector>

#include "reach/kriging.h"
#include "windrow/reach/reach.h"

namespace {

using namespace windrow;
using namespace windrow::reach;

/// The next word must be `name`: keeps both sides honest about the order.
template <class T>
T value(const std::string& name) {
  std::string word;
  if (!(std::cin >> word) || word != name) throw std::runtime_error("expected '" + name + "', found '" + word + "'");
  T v{};
  std::cin >> v;
  return v;
}

std::vector<GeoPoint> points(const std::string& name) {
  std::vector<GeoPoint> out(value<std::size_t>(name));
  for (GeoPoint& p : out) {
    double longitude = 0, latitude = 0;
    std::cin >> longitude >> latitude;
    p = {Angle::degrees(longitude), Angle::degrees(latitude)};
  }
  return out;
}

std::vector<double> numbers(const std::string& name) {
  std::vector<double> v(value<std::size_t>(name));
  for (double& x : v) std::cin >> x;
  return v;
}

/// Plain weights of all sites for each cell, as of one system, and their variance.
void print_plain(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options) {
  const Sites sites = merge_sites(stations, options);
  const std::size_t n = sites.position.size();
  const auto matrix = site_covariance(sites.position, sites.noise, options.variogram);
  KrigingSystem system;
  system.set(matrix, n, options.variogram.sill);
  std::printf("jitter %.17g\n", system.jitter());
  for (const GeoPoint cell : cells) {
    std::vector<double> to_cell(n * kLanes, 0), mu(kLanes), variance(kLanes);
    for (std::size_t i = 0; i < n; ++i) {
      const double h = haversine(unit_vector(cell), sites.position[i]);
      to_cell[i * kLanes] = covariance(options.variogram, model_distance_m(options.variogram.model, h));
    }
    std::vector<double> weight = to_cell;
    system.weights(weight.data(), mu.data());
    estimation_variance(matrix, n, options.variogram.sill, weight.data(), to_cell.data(), variance.data());
    std::printf("plain %.17g", variance[0]);
    for (std::size_t i = 0; i < n; ++i) std::printf(" %.17g", weight[i * kLanes]);
    std::printf("\n");
  }
}

void print_map(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options) {
  const ReachMap reach = make_reach(stations, cells, options);
  for (std::size_t i = 0; i < cells.size(); ++i) {
    std::printf("row %.17g %.17g", reach.variance[i], reach.fade[i]);
    for (auto p = reach.map.row_start[i]; p < reach.map.row_start[i + 1]; ++p) {
      std::printf(" %u %.17g", reach.map.column[p], reach.map.share[p]);
    }
    std::printf("\n");
  }
  std::printf("clipped %llu %llu\n", static_cast<unsigned long long>(reach.clipped),
              static_cast<unsigned long long>(reach.clipped_cells));
}

void run() {
  Options options;
  options.method = Method::kriging;
  const auto model = value<std::string>("model");
  options.variogram.model = model == "exponential" ? Variogram::Model::exponential
                            : model == "spherical" ? Variogram::Model::spherical
                                                   : Variogram::Model::gaussian;
  options.variogram.nugget = value<double>("nugget");
  options.variogram.sill = value<double>("sill");
  options.variogram.range_m = value<double>("range");
  options.radius_m = value<double>("radius");
  options.neighbours = value<int>("neighbours");
  const auto stations = points("stations");
  const auto cells = points("cells");
  options.noise = numbers("noise");
  const auto values = numbers("values");
  const auto heights = numbers("heights");
  print_plain(stations, cells, options);
  print_map(stations, cells, options);
  const std::size_t width = values.size() / stations.size();
  Notices notices;
  const Variogram fit = fit_variogram(stations, values, width, options.noise, options.variogram.model, notices);
  std::printf("fit %.17g %.17g %.17g\n", fit.nugget, fit.sill, fit.range_m);
  const Drift drift = fit_drift(heights, values, width, stations, options.variogram, options.noise, notices);
  std::printf("slope");
  for (const double s : drift.slope) std::printf(" %.17g", s);
  std::printf("\n");
}

}  // namespace

int main() {
  try {
    run();
  } catch (const std::exception& e) {
    std::fprintf(stderr, "%s\n", e.what());
    return 1;
  }
  return 0;
}
