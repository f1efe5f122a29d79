// Reach of station values into the mesh: nearest station and tapered inverse distance here, the map of all methods, and
// leave-one-out. Kriging's weights are made in kriging.cpp; no variograms.
#include "windrow/reach/reach.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <iterator>
#include <limits>
#include <optional>

#include "kriging.h"
#include "rows.h"
#include "windrow/base/error.h"

namespace windrow::reach {
namespace {

/// Cells a task; also the order in which rows are joined, so it must not depend on the number of threads.
constexpr std::size_t kBlock = 1024;

void weigh(const Neighbourhood& near, double nearest, double power, Block& block) {
  const std::size_t first = block.column.size();
  double total = 0;
  for (const Neighbour& n : near.near()) {
    const double d = arc_m(n.haversine);
    // Relative to the nearest, so that no power overflows.
    double w = nearest < kSamePoint_m ? (d < kSamePoint_m ? 1 : 0)
                                      : shepard_weight(d / nearest, power) * taper(d / near.cut_m());
    // All used stations as far as the first unused one: the limit of the tapers' ratio is undefined; they share.
    if (nearest >= near.cut_m() && d <= near.cut_m()) w = 1;
    if (w <= 0) continue;
    block.push(n.station, w);
    total += w;
  }
  for (std::size_t i = first; i < block.share.size(); ++i) block.share[i] /= total;
}

void add_row(const Options& options, const Vector& cell, Neighbourhood& near, Block& block) {
  near.find(cell);
  const std::size_t before = block.column.size();
  double fade = 0;
  if (!near.near().empty()) {
    const Neighbour first = near.nearest();
    const double nearest = arc_m(first.haversine);
    fade = fade_of(nearest, options.radius_m);
    if (nearest < options.radius_m) {
      if (options.method == Method::nearest) {
        block.push(first.station, 1);
      } else {
        weigh(near, nearest, options.power, block);
      }
    }
  }
  block.count.push_back(static_cast<std::uint32_t>(block.column.size() - before));
  block.fade.push_back(fade);
}

void check_kriging(std::size_t stations, const Options& options) {
  check(options.variogram);
  if (!options.noise.empty() && options.noise.size() != stations) {
    throw Error(Failure::defect, "reach",
                fmt::format("{} sampling variances for {} stations", options.noise.size(), stations));
  }
  for (const double v : options.noise) {
    if (!(v >= 0) || std::isinf(v)) {
      throw Error(Failure::data, "reach", fmt::format("a station's sampling variance is {}, not a number >= 0", v));
    }
  }
}

void say(const Kriging& kriging, double jitter, Notices& notices) {
  if (kriging.sites().merged > 0) {
    notices.add("reach", fmt::format("{} stations stand within {:g} m of others and have neither nugget nor sampling "
                                     "variance: those of one place share equally",
                                     kriging.sites().merged, kSamePoint_m));
  }
  if (jitter > 0) {
    notices.add("reach", fmt::format("the stations' covariances are singular to rounding (stations close together "
                                     "beside the variogram's range, no nugget): {:g} of the sill added to the diagonal",
                                     jitter));
  }
}

std::string provenance(Method method) {
  return method == Method::nearest            ? "reach: nearest station"
         : method == Method::inverse_distance ? "reach: inverse distance"
                                              : "reach: ordinary kriging";
}

ReachMap join(std::vector<Block>& parts, std::size_t stations, std::size_t cells) {
  ReachMap reach;
  reach.map.columns = reach.map.value_columns = stations;
  reach.map.row_start.reserve(cells + 1);
  reach.map.row_start.push_back(0);
  for (Block& part : parts) {
    for (const std::uint32_t n : part.count) reach.map.row_start.push_back(reach.map.row_start.back() + n);
    std::copy(part.column.begin(), part.column.end(), std::back_inserter(reach.map.column));
    std::copy(part.share.begin(), part.share.end(), std::back_inserter(reach.map.share));
    std::copy(part.fade.begin(), part.fade.end(), std::back_inserter(reach.fade));
    std::copy(part.variance.begin(), part.variance.end(), std::back_inserter(reach.variance));
    reach.clipped += part.clipped;
    reach.clipped_cells += part.clipped_cells;
    part = {};
  }
  return reach;
}

}  // namespace

double distance_m(GeoPoint a, GeoPoint b) {
  const double s_phi = std::sin((b.latitude.radians() - a.latitude.radians()) / 2);
  const double s_lambda = std::sin((b.longitude.radians() - a.longitude.radians()) / 2);
  return arc_m(s_phi * s_phi + std::cos(a.latitude.radians()) * std::cos(b.latitude.radians()) * s_lambda * s_lambda);
}

double shepard_weight(double distance, double power) {
  return power == 2 ? 1 / (distance * distance) : std::pow(distance, -power);
}

ReachMap make_reach(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options,
                    Notices* notices) {
  std::optional<Kriging> kriging;
  if (options.method == Method::kriging) {
    check_kriging(stations.size(), options);
    kriging.emplace(stations, options);
  }
  std::vector<Vector> positions;
  for (const GeoPoint& s : stations) positions.push_back(unit_vector(s));
  const std::size_t blocks = (cells.size() + kBlock - 1) / kBlock;
  std::vector<Block> parts(blocks);
#pragma omp parallel
  {
    Neighbourhood near(positions, options);
#pragma omp for schedule(dynamic)
    for (std::size_t b = 0; b < blocks; ++b) {
      const std::size_t end = std::min(cells.size(), (b + 1) * kBlock);
      if (kriging) {
        kriging->rows({&cells[b * kBlock], end - b * kBlock}, parts[b]);
      } else {
        for (std::size_t i = b * kBlock; i < end; ++i) add_row(options, unit_vector(cells[i]), near, parts[b]);
      }
    }
  }
  if (kriging && notices != nullptr) {
    double jitter = kriging->jitter();
    for (const Block& part : parts) jitter = std::max(jitter, part.jitter);
    say(*kriging, jitter, *notices);
  }
  ReachMap reach = join(parts, stations.size(), cells.size());
  reach.map.provenance = provenance(options.method);
  return reach;
}

LeftOut leave_one_out(const std::vector<GeoPoint>& stations, const std::vector<double>& values, std::size_t width,
                      const Options& options) {
  const std::size_t n = stations.size();
  if (values.size() != n * width) throw Error(Failure::defect, "reach", "values do not fit the stations");
  if (options.method == Method::kriging) check_kriging(n, options);
  LeftOut out;
  out.value.assign(n * width, std::numeric_limits<double>::quiet_NaN());
  out.fade.assign(n, 0);
#pragma omp parallel for schedule(dynamic)
  for (std::size_t i = 0; i < n; ++i) {
    std::vector<GeoPoint> rest;
    std::vector<std::size_t> number;
    Options without = options;
    without.noise.clear();
    for (std::size_t j = 0; j < n; ++j) {
      if (j == i || distance_m(stations[i], stations[j]) <= kLeftOutTogether_m) continue;
      rest.push_back(stations[j]);
      number.push_back(j);
      if (!options.noise.empty()) without.noise.push_back(options.noise[j]);
    }
    const ReachMap reach = make_reach(rest, {stations[i]}, without);
    out.fade[i] = reach.fade[0];
    if (reach.map.pairings() == 0) continue;
    std::fill_n(&out.value[i * width], width, 0.0);
    for (std::size_t p = 0; p < reach.map.pairings(); ++p) {
      const double* from = &values[number[reach.map.column[p]] * width];
      for (std::size_t k = 0; k < width; ++k) out.value[i * width + k] += reach.map.share[p] * from[k];
    }
  }
  return out;
}

}  // namespace windrow::reach
