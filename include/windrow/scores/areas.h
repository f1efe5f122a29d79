// Points and areas: how alike stations are against their distance, and the extremes of means over groups of stations.
// The product is read at the stations' sites; a point's distribution given to every place overstates areal extremes
// (Maraun 2013, J. Climate 26:2137).
#pragma once
#include <string>
#include <vector>

#include "windrow/scores/resample.h"
#include "windrow/scores/split.h"

namespace windrow::scores {

/// Daily series by station, all in the order of the same days; NaN missing.
using Field = std::vector<std::vector<double>>;

struct CorrelationBin {
  double from_m, to_m;        ///< from <= distance < to
  int pairs;                  ///< of stations, with both correlations
  double observed, modelled;  ///< means of the pairs' correlations; NaN without pairs
};
/// Correlations of each pair of stations over the season's days on which observations and product have a value at both,
/// where there are at least `fewest_days` of them. The yearly cycle counts as likeness: choose short seasons. `edges_m`
/// ascend strictly; pairs outside are left out. Error(defect) for series of other lengths.
std::vector<CorrelationBin> correlation_by_distance(const Days& days, const Season& season, const Field& observed,
                                                    const Field& modelled, const Distance& distance,
                                                    const std::vector<double>& edges_m, int fewest_days = 300);

/// The ratios product over observed that areal extremes may have.
inline constexpr double kLeastAreaRatio = 0.8, kLargestAreaRatio = 1.25;

enum class AreaVerdict { sound, refused, too_small };

struct AreaScores {
  std::size_t stations, days;
  int years;                                         ///< well-sampled ones
  Estimate variance, percentile_95, yearly_maximum;  ///< of the area's mean; value is the ratio product / observed
  AreaVerdict verdict;
  std::string sentence;  ///< the verdict in plain words
};
/// The mean precipitation (mm/day) over a group of stations, on days on which all of them have both values. Refused
/// where one of the three ratios leaves 0.8 .. 1.25 or cannot be had; too small below kFewestYears. The yearly maximum
/// is Rx1day. Refusal is by the ratio itself, not by its interval: the burden of proof is the product's. Error(defect)
/// for series of other lengths.
AreaScores score_area(const Days& days, const Season& season, const Field& observed, const Field& modelled,
                      const std::vector<std::size_t>& group, const Resampling& resampling);

}  // namespace windrow::scores
