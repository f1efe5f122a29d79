// Draws of years from a counter-based generator, and percentile intervals.
#include "windrow/scores/resample.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

namespace windrow::scores {
namespace {

constexpr std::uint64_t kGolden = 0x9e3779b97f4a7c15;

/// SplitMix64's next number from a state.
std::uint64_t mix(std::uint64_t z) {
  z += kGolden;
  z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9;
  z = (z ^ (z >> 27)) * 0x94d049bb133111eb;
  return z ^ (z >> 31);
}

}  // namespace

std::vector<int> draw_years(const Resampling& resampling, int replicate, std::size_t years) {
  std::vector<int> times(years, 0);
  const std::uint64_t state =
      mix(mix(mix(resampling.seed) + resampling.stream) + static_cast<std::uint64_t>(replicate));
  for (std::size_t k = 0; k < years; ++k) {
    const std::uint64_t word = mix(state + (k + 1) * kGolden);
    ++times[((word >> 32) * years) >> 32];
  }
  return times;
}

Interval interval_of(std::vector<double> replicates) {
  const std::size_t all = replicates.size();
  replicates.erase(std::remove_if(replicates.begin(), replicates.end(), [](double v) { return std::isnan(v); }),
                   replicates.end());
  if (10 * replicates.size() < 9 * all || replicates.empty()) {
    return {std::numeric_limits<double>::quiet_NaN(), std::numeric_limits<double>::quiet_NaN()};
  }
  std::sort(replicates.begin(), replicates.end());
  return {stats::quantile(replicates, 0.05, 7), stats::quantile(replicates, 0.95, 7)};
}

SeasonScores score_season(const Sample& sample, const Resampling& resampling) {
  if (resampling.replicates < 1) {
    throw Error(Failure::defect, "scores", fmt::format("{} replicates; expected at least 1", resampling.replicates));
  }
  std::array<std::vector<double>, kScores> replicates;
  for (int r = 0; r < resampling.replicates; ++r) {
    const Values values = sample.scores(draw_years(resampling, r, sample.years().size()));
    for (std::size_t s = 0; s < kScores; ++s) replicates[s].push_back(values[s].value);
  }
  const Values values = sample.scores();
  SeasonScores out{{}, sample.days(), sample.well_sampled_years(), sample.well_sampled_years() < kFewestYears};
  for (std::size_t s = 0; s < kScores; ++s) out.score[s] = {values[s], interval_of(std::move(replicates[s]))};
  return out;
}

}  // namespace windrow::scores
