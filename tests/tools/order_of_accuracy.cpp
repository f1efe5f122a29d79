// Test tool: measures how fast the errors of the conservative methods fall as meshes are refined, on analytic fields
// with exact cell means, and fails where an order or a bound is not kept. The smooth method is measured in
// smooth_measures.h. Usage: order_of_accuracy [--full]   (--full: one more refinement, one more pair of meshes,
// and slopes without limits on all)
#include <array>
#include <cmath>
#include <cstdio>
#include <cstring>
#include <exception>
#include <numbers>
#include <random>
#include <string>
#include <vector>

#include "exact_means.h"
#include "measured.h"
#include "smooth_measures.h"
#include "windrow/overlap/methods.h"
#include "windrow/sphere/area.h"

namespace {

using namespace windrow;
using namespace windrow::test;

int failures = 0;

void require(bool holds, const std::string& what) {
  if (holds) return;
  ++failures;
  std::printf("FAILED: %s\n", what.c_str());
}

// Every kind of grid after one number of refinements, with spacings like each other's.
enum Kind : std::size_t { lat_lon, healpix, triangles, cubed_sphere };
constexpr std::array<const char*, 4> kKinds{"lat-lon", "HEALPix", "triangles", "cubed"};

std::array<Grid, 4> grids(int k) {
  return {latlon_grid(32 << k, 0), healpix_grid(4 + k), loops_grid(icosahedral(3 + k)),
          loops_grid(cubed(static_cast<std::size_t>(15) << k))};
}

struct Pair {
  Kind source, target;
  bool unlimited;
};

constexpr std::size_t kMethods = 3;
constexpr std::array<const char*, kMethods> kMethodNames{"conservative-1", "conservative-2", "unlimited"};

// Errors of one field and method over all refinements.
struct Errors {
  std::vector<double> spacing, l1, l2, most;
  double under = 0, over = 0, beyond_near = 0, beyond_all = 0, unbalanced = 0;
};

double slope(const std::vector<double>& spacing, const std::vector<double>& error) {
  double x = 0, y = 0, xx = 0, xy = 0;
  const auto n = static_cast<double>(error.size());
  for (std::size_t k = 0; k < error.size(); ++k) {
    const double lx = std::log(spacing[k]), ly = std::log(error[k]);
    x += lx / n;
    y += ly / n;
    xx += lx * lx / n;
    xy += lx * ly / n;
  }
  return (xy - x * y) / (xx - x * x);
}

double last_step(const std::vector<double>& spacing, const std::vector<double>& error) {
  const std::size_t n = error.size();
  return std::log(error[n - 2] / error[n - 1]) / std::log(spacing[n - 2] / spacing[n - 1]);
}

using Table = std::array<std::array<Errors, kMethods>, kFields>;

// Without limits only where `unlimited`: for comparison.
void measure_level(const Grid& source, const Grid& target, bool unlimited, Table& table) {
  const double spacing = std::sqrt(4 * std::numbers::pi / static_cast<double>(source.mesh->size()));
  const overlap::Result first = overlap::conservative(*source.mesh, *target.mesh, linear_map::Quantity::mean);
  const overlap::Result second = overlap::conservative_linear(*source.mesh, *target.mesh, linear_map::Quantity::mean);
  require(first.closure.holds && second.closure.holds, "sums of shares within their bounds");
  const auto limited = overlap::make_gradient(*source.mesh, linear_map::Quantity::mean, true);
  std::vector<Fields> results{apply(first.map, nullptr, source.mean), apply(second.map, limited.get(), source.mean)};
  if (unlimited) {
    const auto free = overlap::make_gradient(*source.mesh, linear_map::Quantity::mean, false);
    results.push_back(apply(second.map, free.get(), source.mean));
  }
  const overlap::Neighbours near = overlap::neighbours(*source.mesh);
  const overlap::Neighbours nothing{std::vector<std::uint64_t>(source.mesh->size() + 1), {}};
  for (std::size_t f = 0; f < kFields; ++f) {
    // A constant within each source cell stays within the range of the cells that overlap; a slope needs those around.
    const Ranges of_overlaps = ranges_near(first.map, nothing, source.mean[f]);
    const Ranges of_touching = ranges_near(first.map, near, source.mean[f]);
    for (std::size_t m = 0; m < results.size(); ++m) {
      const Measured got =
          measured(results[m][f], target.mean[f], source.mean[f], first.map, m == 0 ? of_overlaps : of_touching);
      Errors& to = table[f][m];
      to.spacing.push_back(spacing);
      to.l1.push_back(got.l1);
      to.l2.push_back(got.l2);
      to.most.push_back(got.most);
      to.under = std::max(to.under, got.under);
      to.over = std::max(to.over, got.over);
      to.beyond_near = std::max(to.beyond_near, got.beyond_near);
      to.beyond_all = std::max(to.beyond_all, got.beyond_all);
      to.unbalanced = std::max(to.unbalanced, got.unbalanced);
    }
  }
}

void print_and_judge(const Pair& pair, const Table& table) {
  const std::string ends = std::string(kKinds[pair.source]) + " -> " + kKinds[pair.target];
  constexpr std::array<double, kMethods> least{0.95, 1.9, 0};
  std::printf("%s, source cells of", ends.c_str());
  for (const double spacing : table[0][0].spacing) std::printf(" %.2f", spacing * 180 / std::numbers::pi);
  std::printf(" degrees\n");
  for (std::size_t f = 0; f < kFields; ++f) {
    for (std::size_t m = 0; m < kMethods; ++m) {
      const Errors& e = table[f][m];
      if (e.l2.empty()) continue;
      const double order = slope(e.spacing, e.l2), last = last_step(e.spacing, e.l2);
      std::printf("%-22s %-7s %-14s", ends.c_str(), kFieldNames[f], kMethodNames[m]);
      for (const double error : e.l2) std::printf(" %.2e", error);
      std::printf("  %5.2f %5.2f %5.2f %5.2f  %8.1e %8.1e %8.1e\n", order, last, slope(e.spacing, e.l1),
                  slope(e.spacing, e.most), e.under, e.over, e.beyond_near);
      const std::string place = ends + ", " + kFieldNames[f] + ", " + kMethodNames[m];
      if (least[m] > 0) {
        // The last step too: coarse levels do not resolve the sharper fields, which makes the first steps steep.
        require(std::min(order, last) >= least[m], place + ": order of the L2 error below its bound");
        require(e.beyond_all <= kRounding, place + ": a new extreme");
        require(e.beyond_near <= kRounding, place + ": beyond the range of the source cells there");
      }
      require(e.unbalanced <= 1e-12, place + ": the integral is not kept");
    }
  }
}

void check_fields() {
  double worst = 0;
  for (int k = 0; k < 2000; ++k) {
    const double lambda = 0.0031415 * k, theta = std::asin(std::cos(1.7 * k));
    const FieldValues a = fields_as_printed(lambda, theta);
    const FieldValues b =
        fields_at({std::cos(theta) * std::cos(lambda), std::cos(theta) * std::sin(lambda), std::sin(theta)});
    for (std::size_t f = 0; f < kFields; ++f) worst = std::max(worst, std::abs(a[f] - b[f]));
  }
  std::printf("fields by components against the printed formulas: %.1e\n", worst);
  require(worst < 1e-12, "fields by components are those printed");
}

// Y2 over latitude-longitude cells has a closed form: 2 area + [sin(2 lambda) / 2] [sin(theta) - sin^3(theta) / 3].
void check_closed_form(const Grid& grid) {
  const mesh::LatLonEdges& edges = *grid.mesh->latlon();
  constexpr double degree = std::numbers::pi / 180;
  const auto in_lambda = [&](std::size_t i) { return 0.5 * std::sin(2 * degree * edges.lon_deg[i]); };
  const auto in_theta = [&](std::size_t j) {
    const double s = std::sin(degree * edges.lat_deg[j]);
    return s - s * s * s / 3;
  };
  double worst = 0;
  const std::size_t nx = edges.lon_deg.size() - 1;
  for (std::size_t k = 0; k < grid.integral.size(); ++k) {
    const std::size_t j = k / nx, i = k % nx;
    const double exact = (in_lambda(i + 1) - in_lambda(i)) * (in_theta(j + 1) - in_theta(j)) / grid.mesh->area(k);
    worst = std::max(worst, std::abs(grid.mean[0][k] - 2 - exact));
  }
  std::printf("means of Y2 over lat-lon cells against the closed form: %.1e\n", worst);
  require(worst < 1e-11, "means of Y2 are those of the closed form");
}

// The quadrature against a finer one, against the mean of each field over the sphere (2, 2, and 1 by symmetry), and
// against the cells of the engine's mesh: numbering, areas and first moments.
void check_means(const Grid& grid, const std::vector<Integral>& finer, const char* kind) {
  double refined = 0, overall = 0, area = 0, moment = 0;
  FieldValues sum{};
  for (std::size_t k = 0; k < grid.integral.size(); ++k) {
    const Integral& cell = grid.integral[k];
    for (std::size_t f = 0; f < kFields; ++f) {
      refined = std::max(refined, std::abs(grid.mean[f][k] - finer[k].field[f] / finer[k].area));
      sum[f] += cell.field[f];
    }
    area = std::max(area, std::abs(cell.area / grid.mesh->area(k) - 1));
    sphere::Vec3 whole;
    for (const sphere::Piece& piece : grid.mesh->cell(k).pieces) {
      whole = whole + sphere::moment(piece, piece.loops[0][0].from);
    }
    moment = std::max(moment, norm(whole - cell.position) / std::pow(cell.area, 1.5));
  }
  for (std::size_t f = 0; f < kFields; ++f) {
    overall = std::max(overall, std::abs(sum[f] / (4 * std::numbers::pi) - (f == 2 ? 1 : 2)));
  }
  std::printf("%-10s means against finer quadrature %.1e, over the sphere %.1e; mesh areas %.1e, moments %.1e\n", kind,
              refined, overall, area, moment);
  require(refined < 1e-11, std::string(kind) + ": means of cells within 1e-11");
  require(overall < 1e-12, std::string(kind) + ": means over the sphere within 1e-12");
  // The engine's HEALPix sides are a few arcs each that keep the exact areas and nearly the exact shapes.
  require(area < 1e-9 && moment < 1e-5, std::string(kind) + ": quadrature and mesh speak of the same cells");
}

void check_quadrature() {
  const std::array<Grid, 4> grid = grids(1);
  const ExactMeans finer(8, 0.03);
  check_closed_form(grid[lat_lon]);
  const mesh::LatLonEdges& edges = *grid[lat_lon].mesh->latlon();
  check_means(grid[lat_lon], finer.latlon(edges.lon_deg, edges.lat_deg), kKinds[lat_lon]);
  check_means(grid[healpix], finer.healpix(5), kKinds[healpix]);
  check_means(grid[triangles], finer.loops(icosahedral(4)), kKinds[triangles]);
  check_means(grid[cubed_sphere], finer.loops(cubed(30)), kKinds[cubed_sphere]);
}

void check_orders(const std::vector<Pair>& pairs, int levels) {
  std::vector<Table> tables(pairs.size());
  for (int k = 0; k < levels; ++k) {
    const std::array<Grid, 4> level = grids(k);
    for (std::size_t p = 0; p < pairs.size(); ++p) {
      measure_level(level[pairs[p].source], level[pairs[p].target], pairs[p].unlimited, tables[p]);
    }
  }
  std::printf(
      "\n%-22s %-7s %-14s L2 error at each level; its order by least squares and over the last step; orders of "
      "L1, Linf; Lmin, Lmax; most beyond the range of the source cells there\n",
      "meshes", "field", "method");
  for (std::size_t p = 0; p < pairs.size(); ++p) print_and_judge(pairs[p], tables[p]);
}

// HEALPix cells half again as wide as those of their target. From levels 3 to 5 the first-order error falls unevenly
// (by 2^0.88, then 2^0.67), since few cells meet in few ways there; only finer levels show the order.
void check_wide_healpix() {
  Table table;
  for (int k = 0; k < 4; ++k) measure_level(healpix_grid(5 + k), latlon_grid(144 << k, 0.37), false, table);
  std::printf("wide cells: ");
  print_and_judge({healpix, lat_lon, false}, table);
}

// Bounds on rough fields (a disc of ones, noise, noise far from zero), seen by a mesh fine enough to meet the corners
// of the source cells.
void check_bounded() {
  std::printf("\nrough fields on coarse grids, to lat-lon cells of 0.7 degrees: most beyond the source cells there\n");
  const mesh::MeshPtr target = latlon_mesh(256, 0);
  const std::array<Grid, 4> sources{latlon_grid(9, 0), healpix_grid(2), loops_grid(icosahedral(1)),
                                    loops_grid(cubed(5))};
  for (std::size_t kind = 0; kind < sources.size(); ++kind) {
    const Grid& source = sources[kind];
    std::mt19937_64 random(20260712);
    Fields rough;
    for (const Integral& cell : source.integral) {
      const double noise = static_cast<double>(random() >> 11) * 0x1p-53;
      rough[0].push_back(dot(cell.position, {0.6, 0, 0.8}) > 0.9 * cell.area ? 1 : 0);
      rough[1].push_back(noise);
      rough[2].push_back(10 + noise * noise);
    }
    const auto mean = linear_map::Quantity::mean;
    const overlap::Result first = overlap::conservative(*source.mesh, *target, mean);
    const overlap::Result second = overlap::conservative_linear(*source.mesh, *target, mean);
    const overlap::Neighbours near = overlap::neighbours(*source.mesh);
    std::array<double, 2> beyond{};
    for (const bool limited : {true, false}) {
      const Fields result = apply(second.map, overlap::make_gradient(*source.mesh, mean, limited).get(), rough);
      for (std::size_t f = 0; f < kFields; ++f) {
        const Ranges ranges = ranges_near(first.map, near, rough[f]);
        beyond[limited ? 0 : 1] = std::max(beyond[limited ? 0 : 1], most_beyond(ranges, result[f]));
      }
    }
    std::printf("%-10s limited %.1e, unlimited %.1e\n", kKinds[kind], beyond[0], beyond[1]);
    require(beyond[0] <= 10 * kRounding, std::string(kKinds[kind]) + ": a new extreme on a rough field");
    require(beyond[1] > 0.1, std::string(kKinds[kind]) + ": the fields are rough enough to tell");
  }
}

void check_smooth() {
  std::printf("\nconservative-smooth, lat-lon 2.5 -> 0.5 degrees\n");
  for (const double shift : {0.0, 0.37}) {
    const SmoothMeasured got = measure_smooth(72, 5, shift);
    std::printf("mesh turned by %.2f cells: integrals %.1e, non-negative %.1e; lowest value %.1e, non-negative %.1e\n",
                shift, got.integral, got.integral_non_negative, got.least_free, got.least);
    std::printf("  L2 error of Y2: smooth %.2e, conservative-1 %.2e, conservative-2 %.2e\n", got.l2[0], got.l2[1],
                got.l2[2]);
    require(got.integral <= 1e-10 && got.integral_non_negative <= 1e-10, "smooth: integrals of source cells");
    require(got.least >= 0, "smooth: no value below zero");
    if (shift != 0) continue;
    std::printf("  variance of jumps at source borders gone: %.1f %% (exact means: %.1f %%)\n", 100 * got.jumps_gone,
                100 * got.jumps_gone_exact);
    require(got.jumps_gone >= 0.6, "smooth: share of the variance of jumps that is gone");
  }
}

}  // namespace

int main(int argc, char** argv) {
  try {
    const bool full = argc > 1 && std::strcmp(argv[1], "--full") == 0;
    check_fields();
    check_quadrature();
    std::vector<Pair> pairs{{lat_lon, triangles, true},
                            {healpix, lat_lon, full},
                            {triangles, lat_lon, full},
                            {cubed_sphere, lat_lon, full}};
    if (full) pairs.push_back({triangles, healpix, full});
    check_orders(pairs, full ? 5 : 4);
    if (full) check_wide_healpix();
    check_bounded();
    check_smooth();
    return failures == 0 ? 0 : 1;
  } catch (const std::exception& e) {
    std::fprintf(stderr, "order_of_accuracy: %s\n", e.what());
    return 1;
  }
}
