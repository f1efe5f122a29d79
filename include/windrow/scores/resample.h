// How sure a score is: whole years drawn anew with replacement, the same draw whoever asks and in whatever order.
#pragma once
#include <array>
#include <cstdint>
#include <span>
#include <vector>

#include "windrow/scores/scores.h"

namespace windrow::scores {

/// Fewer well-sampled years than this are too few. Of ten years the interval of a mean holds the truth in about 85 of
/// 100 cases instead of 90 (Student's t with 9 degrees of freedom); with fewer it promises much more than it keeps.
inline constexpr int kFewestYears = 10;

struct Resampling {
  std::uint64_t seed = 1;
  std::uint64_t stream = 0;  ///< the station; stations judged together share one stream, so they lose the same years
  int replicates = 1000;     ///< at least 1, Error(defect) otherwise
};

/// How often each of `years` years is taken in one replicate; the counts sum to `years`. Counter-based: draw k of a
/// replicate is a mix of (seed, stream, replicate, k) alone, by the finaliser of SplitMix64 (Steele, Lea & Flood 2014,
/// from memory):
///   state = mix(mix(mix(seed) + stream) + replicate),  word k = mix(state + (k + 1) * 0x9e3779b97f4a7c15),
/// where mix(z) first adds 0x9e3779b97f4a7c15; year = ((word >> 32) * years) >> 32, even to years/2^32.
std::vector<int> draw_years(const Resampling& resampling, int replicate, std::size_t years);

/// 5th and 95th percentile (type 7) of the replicates: the percentile interval (Efron 1979).
struct Interval {
  double low, high;
};
/// Replicates that are NaN are left out; NaN where fewer than nine in ten remain.
Interval interval_of(std::vector<double> replicates);

struct Estimate {
  Value value;        ///< of all years
  Interval interval;  ///< 90 % interval of value.value
};
struct SeasonScores {
  std::array<Estimate, kScores> score;
  std::size_t days;
  int years;       ///< well-sampled ones: at least half of the season's days
  bool too_small;  ///< years < kFewestYears: the intervals are not to be relied upon
};
inline const Estimate& at(const SeasonScores& season, Score score) {
  return season.score[static_cast<std::size_t>(score)];
}
SeasonScores score_season(const Sample& sample, const Resampling& resampling);

}  // namespace windrow::scores
