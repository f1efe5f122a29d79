// Carrying values from stations to mesh cells: stations x cells -> LinearMap.
#pragma once
#include <cstdint>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/base/notices.h"
#include "windrow/linear_map/linear_map.h"
#include "windrow/reach/variogram.h"

namespace windrow::reach {

enum class Method { nearest, inverse_distance, kriging };

struct Options {
  Method method = Method::inverse_distance;
  double radius_m = 300e3;
  double power = 2;     ///< inverse distance
  int neighbours = 32;  ///< nearest stations used when there are more than kAllStations; 1 makes seams, like nearest
  Variogram variogram;  ///< kriging
  std::vector<double> noise;  ///< kriging: each station's own sampling variance in the variogram's units; empty: 0
};
/// Up to so many stations all are used, whatever `neighbours` says: the taper at the radius alone limits them.
inline constexpr int kAllStations = 500;
/// Kriging drops smaller shares; negative weights beyond it are counted.
inline constexpr double kSmallestShare = 1e-6;

/// Shares of a row sum to 1, or the row is empty (no station within the radius). Columns are stations.
struct ReachMap {
  linear_map::LinearMap map;
  std::vector<double> fade;  ///< rows: 1 near stations, smoothly down to 0 where the nearest one is `radius` away
  /// Kriging: rows; in the variogram's units, before the fade; NaN where the row is empty. Other methods: empty.
  std::vector<double> variance;
  std::uint64_t clipped = 0;        ///< kriging: weights below -kSmallestShare that were set to zero
  std::uint64_t clipped_cells = 0;  ///< cells with such weights
};

/// Great-circle distance in metres on the sphere of kEarthRadius_m (haversine; atan2 form).
double distance_m(GeoPoint a, GeoPoint b);

/// Weight of a station at distance > 0 before any taper: distance^-power (Shepard 1968).
double shepard_weight(double distance, double power);

/// inverse-distance (Shepard 1968): w = d^-p, times a taper that is 1 at the point and reaches zero with zero slope at
/// the radius (or at the first station not used), so that no seams show. A station at the point (under 1 m) takes all;
/// co-located stations share. Nearest: the nearest station takes all; ties go to the lower number. The fade is 1 up to
/// half the radius and falls from there to 0 at the radius with zero slope at both ends: (1-x)^2 (1+2x). Cost: stations
/// x cells distances; the result does not depend on the number of threads.
///
/// Kriging: ordinary kriging (Isaaks & Srivastava 1989, ch. 12). Between stations the covariance of the variogram, on
/// the diagonal its sill and the station's own noise; between station and cell the covariance without nugget at any
/// distance, 0 too: the nugget is noise, the estimate smooths it and does not jump at a station. With neither nugget
/// nor noise a station is honoured. Stations within 1 m of one another with neither are one place and share equally. A
/// system that is singular nevertheless gets the smallest power of ten times the sill (from 1e-12) on its diagonal that
/// helps. Both go to `notices` (if given).
/// Up to kAllStations places all are in one system, factorised once; weights are then tapered as above. Beyond, each
/// cell has its own system of the `neighbours` nearest, where the taper t acts as further noise sill (1/t - 1): a
/// station at the edge counts for nothing in the others' weights either, so no seams show (the idea: Gribov &
/// Krivoruchko 2004, Geostatistical mapping with continuous moving neighborhood, from memory).
/// Then negative weights become zero (Deutsch 1996, Comput. Geosci. 22:765, from memory), shares under kSmallestShare
/// go, and the rest sums to 1. Where no weight is positive the taper alone decides. The variance is that of the shares
/// used, w'Cw - 2 w'c0 + sill: that of a value at the cell, nugget included.
/// Cost a cell: 1.5 n^2 multiplications and n distances with n stations in one system, n^3/6 of `neighbours` beyond.
/// Throws Error when options do not fit the stations.
ReachMap make_reach(const std::vector<GeoPoint>& stations, const std::vector<GeoPoint>& cells, const Options& options,
                    Notices* notices = nullptr);

/// Within this distance stations are left out together: they would stand in for one another.
inline constexpr double kLeftOutTogether_m = 2e3;

struct LeftOut {
  std::vector<double> value;  ///< station * width; NaN where no other station is within the radius; before the fade
  std::vector<double> fade;   ///< station
};

/// What the other stations say at each station: values [station * width] carried there with the same options, without
/// the station and any within kLeftOutTogether_m of it. Missing values (NaN) spread. Cost with kriging: one
/// factorisation (n^3/6 multiplications) a station.
LeftOut leave_one_out(const std::vector<GeoPoint>& stations, const std::vector<double>& values, std::size_t width,
                      const Options& options);

}  // namespace windrow::reach
