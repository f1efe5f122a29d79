// What all methods of reach share: distances, tapers, the stations near a cell, and rows in the making. Private.
#pragma once
#include <array>
#include <cstdint>
#include <vector>

#include "windrow/reach/reach.h"

namespace windrow::reach {

/// Closer than this a station is taken to stand at the point itself.
inline constexpr double kSamePoint_m = 1.0;

using Vector = std::array<double, 3>;
Vector unit_vector(GeoPoint p);

/// Haversine of the angle between two unit vectors: a quarter of the squared chord.
double haversine(const Vector& a, const Vector& b);
double arc_m(double haversine_of_angle);
/// The distance a variogram's model takes: great-circle, for the Gaussian the chord.
double model_distance_m(Variogram::Model model, double haversine_of_angle);

/// 1 with zero slope at t = 0, 0 with zero slope at t = 1.
double taper(double t);
double fade_of(double nearest_m, double radius_m);

struct Neighbour {
  double haversine;
  std::uint32_t station;
  /// Nearer first, ties by number: a total order, so the choice never depends on how it was sorted.
  bool operator<(const Neighbour& o) const {
    return haversine != o.haversine ? haversine < o.haversine : station < o.station;
  }
};

/// The stations used for a cell and where their weights reach zero.
class Neighbourhood {
 public:
  Neighbourhood(const std::vector<Vector>& stations, const Options& options);
  void find(const Vector& cell);
  [[nodiscard]] const std::vector<Neighbour>& near() const { return near_; }  ///< by number
  [[nodiscard]] double cut_m() const { return cut_; }
  /// Infinite when there is none within the radius.
  [[nodiscard]] Neighbour nearest() const;

 private:
  const std::vector<Vector>& stations_;
  const Options& options_;
  std::vector<Neighbour> near_;
  double limit_ = 0, cut_ = 0;
};

/// Consecutive rows of a map.
struct Block {
  std::vector<std::uint32_t> count, column;
  std::vector<double> share, fade, variance;
  std::uint64_t clipped = 0, clipped_cells = 0;
  double jitter = 0;
  void push(std::uint32_t station, double value) {
    column.push_back(station);
    share.push_back(value);
  }
};

}  // namespace windrow::reach
