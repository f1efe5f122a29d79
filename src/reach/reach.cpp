// Reach of station values into the mesh: tapered inverse distance and nearest station. No kriging, no values: shares
// only.
#include "windrow/reach/reach.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <iterator>
#include <numbers>

#include "windrow/base/constants.h"

namespace windrow::reach {
namespace {

/// Closer than this a station is taken to stand at the point itself.
constexpr double kSamePoint_m = 1.0;
/// Cells a task; also the order in which rows are joined, so it must not depend on the number of threads.
constexpr std::size_t kBlock = 1024;

using Vector = std::array<double, 3>;

Vector unit_vector(GeoPoint p) {
  const double phi = p.latitude.radians();
  const double lambda = p.longitude.radians();
  return {std::cos(phi) * std::cos(lambda), std::cos(phi) * std::sin(lambda), std::sin(phi)};
}

/// Haversine of the angle between two unit vectors: a quarter of the squared chord.
double haversine(const Vector& a, const Vector& b) {
  const double x = a[0] - b[0];
  const double y = a[1] - b[1];
  const double z = a[2] - b[2];
  return (x * x + y * y + z * z) / 4;
}

double arc_m(double haversine_of_angle) {
  const double h = std::clamp(haversine_of_angle, 0.0, 1.0);
  return 2 * kEarthRadius_m * std::atan2(std::sqrt(h), std::sqrt(1 - h));
}

/// 1 with zero slope at t = 0, 0 with zero slope at t = 1.
double taper(double t) {
  const double rest = t < 1 ? 1 - t * t : 0;
  return rest * rest;
}

double fade_of(double nearest_m, double radius_m) {
  const double x = std::clamp((nearest_m - radius_m / 2) / (radius_m / 2), 0.0, 1.0);
  return (1 - x) * (1 - x) * (1 + 2 * x);
}

struct Neighbour {
  double haversine;
  std::uint32_t station;
  /// Nearer first, ties by number: a total order, so the choice never depends on how it was sorted.
  bool operator<(const Neighbour& o) const {
    return haversine != o.haversine ? haversine < o.haversine : station < o.station;
  }
};

struct Block {
  std::vector<std::uint32_t> count, column;
  std::vector<double> share, fade;
};

class Rows {
 public:
  Rows(const std::vector<GeoPoint>& stations, const Options& options) : options_(options) {
    for (const GeoPoint& s : stations) stations_.push_back(unit_vector(s));
    const double half_angle = options.radius_m / (2 * kEarthRadius_m);
    const double s = half_angle < std::numbers::pi / 2 ? std::sin(half_angle) : 1;
    // A margin of rounding; the taper and the fade decide at the radius itself.
    limit_ = s * s * (1 + 1e-12);
  }

  void add(GeoPoint cell, Block& block) {
    find(unit_vector(cell));
    const std::size_t before = block.column.size();
    double fade = 0;
    if (!near_.empty()) {
      const double nearest = arc_m(std::min_element(near_.begin(), near_.end())->haversine);
      fade = fade_of(nearest, options_.radius_m);
      if (nearest < options_.radius_m) {
        if (options_.method == Method::nearest) {
          push(block, std::min_element(near_.begin(), near_.end())->station, 1);
        } else {
          weigh(nearest, block);
        }
      }
    }
    block.count.push_back(static_cast<std::uint32_t>(block.column.size() - before));
    block.fade.push_back(fade);
  }

 private:
  static void push(Block& block, std::uint32_t station, double share) {
    block.column.push_back(station);
    block.share.push_back(share);
  }

  /// Stations within the radius, and where the cut-off lies.
  void find(const Vector& cell) {
    near_.clear();
    for (std::size_t j = 0; j < stations_.size(); ++j) {
      const double h = haversine(cell, stations_[j]);
      if (h <= limit_) near_.push_back({h, static_cast<std::uint32_t>(j)});
    }
    cut_ = options_.radius_m;
    const auto wanted = static_cast<std::size_t>(std::max(options_.neighbours, 1));
    if (stations_.size() > static_cast<std::size_t>(kAllStations) && near_.size() > wanted) {
      const auto first_unused = near_.begin() + static_cast<std::ptrdiff_t>(wanted);
      std::nth_element(near_.begin(), first_unused, near_.end());
      cut_ = std::min(cut_, arc_m(first_unused->haversine));
      near_.erase(first_unused, near_.end());
      std::sort(near_.begin(), near_.end(),
                [](const Neighbour& a, const Neighbour& b) { return a.station < b.station; });
    }
  }

  void weigh(double nearest, Block& block) {
    const std::size_t first = block.column.size();
    double total = 0;
    for (const Neighbour& n : near_) {
      const double d = arc_m(n.haversine);
      // Relative to the nearest, so that no power overflows.
      double w = nearest < kSamePoint_m ? (d < kSamePoint_m ? 1 : 0)
                                        : shepard_weight(d / nearest, options_.power) * taper(d / cut_);
      // All used stations as far as the first unused one: the limit of the tapers' ratio is undefined; they share.
      if (nearest >= cut_ && d <= cut_) w = 1;
      if (w <= 0) continue;
      push(block, n.station, w);
      total += w;
    }
    for (std::size_t i = first; i < block.share.size(); ++i) block.share[i] /= total;
  }

  Options options_;
  std::vector<Vector> stations_;
  std::vector<Neighbour> near_;
  double limit_ = 0, cut_ = 0;
};

}  // namespace

double distance_m(GeoPoint a, GeoPoint b) {
  const double s_phi = std::sin((b.latitude.radians() - a.latitude.radians()) / 2);
  const double s_lambda = std::sin((b.longitude.radians() - a.longitude.radians()) / 2);
  return arc_m(s_phi * s_phi + std::cos(a.latitude.radians()) * std::cos(b.latitude.radians()) * s_lambda * s_lambda);
}

double shepard_weight(double distance, double power) {
  return power == 2 ? 1 / (distance * distance) : std::pow(distance, -power);
}

ReachMap make_reach(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options) {
  const std::size_t blocks = (cells.size() + kBlock - 1) / kBlock;
  std::vector<Block> parts(blocks);
#pragma omp parallel
  {
    Rows rows(stations, options);
#pragma omp for schedule(dynamic)
    for (std::size_t b = 0; b < blocks; ++b) {
      const std::size_t end = std::min(cells.size(), (b + 1) * kBlock);
      for (std::size_t i = b * kBlock; i < end; ++i) rows.add(cells[i], parts[b]);
    }
  }
  ReachMap reach;
  reach.map.columns = reach.map.value_columns = stations.size();
  reach.map.provenance = options.method == Method::nearest ? "reach: nearest station" : "reach: inverse distance";
  reach.map.row_start.reserve(cells.size() + 1);
  reach.map.row_start.push_back(0);
  for (Block& part : parts) {
    for (const std::uint32_t n : part.count) reach.map.row_start.push_back(reach.map.row_start.back() + n);
    std::copy(part.column.begin(), part.column.end(), std::back_inserter(reach.map.column));
    std::copy(part.share.begin(), part.share.end(), std::back_inserter(reach.map.share));
    std::copy(part.fade.begin(), part.fade.end(), std::back_inserter(reach.fade));
    part = {};
  }
  return reach;
}

}  // namespace windrow::reach
