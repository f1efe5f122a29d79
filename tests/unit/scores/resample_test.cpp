// Laws of the draws of years and of the intervals made from them.
#include <doctest/doctest.h>

#include <numeric>

#include "series.h"
#include "windrow/base/error.h"
#include "windrow/scores/resample.h"
#include "windrow/stats/stats.h"

using namespace windrow;
using namespace windrow::scores;
using invented::kNaN;
using invented::season;

namespace {

bool same(double a, double b) { return a == b || (std::isnan(a) && std::isnan(b)); }

/// A year is one value, standing on two days of January.
struct YearlyValues {
  std::vector<calendar::Date> dates;
  std::vector<double> zero, value;

  explicit YearlyValues(const std::vector<double>& yearly) {
    for (std::size_t y = 0; y < yearly.size(); ++y) {
      for (int day = 1; day <= 2; ++day) {
        dates.push_back({1900 + static_cast<int>(y), 1, day});
        zero.push_back(0);
        value.push_back(yearly[y]);
      }
    }
  }
  [[nodiscard]] Sample sample() const {
    return Sample(Days(calendar::Calendar(), dates), season("January"), Options{}, zero, value);
  }
};

}  // namespace

TEST_CASE("draws are pinned: seed, stream and replicate alone decide") {
  // Computed from the formula in resample.h by an independent program (tests/reference/scores.py has it).
  CHECK(draw_years({1, 0, 10}, 0, 8) == std::vector<int>{0, 1, 0, 2, 2, 0, 2, 1});
  CHECK(draw_years({1, 7, 10}, 3, 8) == std::vector<int>{0, 1, 0, 0, 1, 4, 1, 1});
  CHECK(draw_years({1, 0, 10}, 0, 8) == draw_years({1, 0, 1000}, 0, 8));
  CHECK(draw_years({1, 0, 10}, 0, 0).empty());
}

TEST_CASE("each replicate takes as many years as there are, each year as often as any other") {
  const int replicates = 20000;
  std::vector<double> taken(7, 0), pairs(7, 0);
  for (int r = 0; r < replicates; ++r) {
    const std::vector<int> times = draw_years({3, 5, replicates}, r, 7);
    REQUIRE(std::accumulate(times.begin(), times.end(), 0) == 7);
    for (std::size_t y = 0; y < 7; ++y) {
      taken[y] += times[y];
      pairs[y] += times[y] * (times[y] - 1);
    }
  }
  // Binomial(7, 1/7) a year and replicate: mean 1, variance 6/7; E[n(n-1)] = 6/7. Five standard errors of each.
  for (std::size_t y = 0; y < 7; ++y) {
    CHECK(std::fabs(taken[y] / replicates - 1) < 5 * std::sqrt(6.0 / 7 / replicates));
    CHECK(std::fabs(pairs[y] / replicates - 6.0 / 7) < 5 * 1.7 / std::sqrt(replicates));
  }
}

TEST_CASE("streams, seeds and replicates are unlike one another") {
  int alike = 0;
  for (int r = 0; r < 500; ++r) {
    alike += draw_years({1, 1, 1}, r, 30) == draw_years({1, 2, 1}, r, 30);
    alike += draw_years({1, 1, 1}, r, 30) == draw_years({2, 1, 1}, r, 30);
    alike += draw_years({1, 1, 1}, r, 30) == draw_years({1, 1, 1}, r + 1, 30);
  }
  CHECK(alike == 0);
}

TEST_CASE("the interval leaves out what is missing, and is missing when much is") {
  std::vector<double> values(101);
  std::iota(values.begin(), values.end(), 0.0);
  CHECK(interval_of(values).low == 5);
  CHECK(interval_of(values).high == 95);
  std::vector<double> gaps = values;
  gaps.resize(111, kNaN);
  CHECK(interval_of(gaps).low == 5);
  gaps.resize(113, kNaN);  // 101 of 113 is below nine in ten
  CHECK(std::isnan(interval_of(gaps).low));
  CHECK(std::isnan(interval_of({}).high));
}

TEST_CASE("the interval does not depend on the order of calls") {
  const Days days = invented::years(1961, 2000);
  const auto observed = invented::temperature(days, 10, 3, 21), modelled = invented::temperature(days, 11, 3, 22);
  const Sample january(days, season("January"), Options{}, observed, modelled);
  const Sample july(days, season("July"), Options{}, observed, modelled);
  const Resampling resampling{11, 4, 200};
  const SeasonScores first = score_season(january, resampling);
  (void)score_season(july, resampling);
  const SeasonScores again = score_season(january, resampling);
  for (std::size_t s = 0; s < kScores; ++s) {
    CHECK(same(first.score[s].interval.low, again.score[s].interval.low));
    CHECK(same(first.score[s].interval.high, again.score[s].interval.high));
  }
  CHECK(first.years == 40);
  CHECK(at(first, Score::bias).interval.low <= at(first, Score::bias).value.value);
  CHECK(at(first, Score::bias).interval.high >= at(first, Score::bias).value.value);
  CHECK_THROWS_AS((void)score_season(january, {1, 1, 0}), Error);
}

TEST_CASE("the interval of a mean is as wide as the spread of the years over the root of their number says") {
  std::mt19937_64 random(31);
  std::normal_distribution<double> normal;
  for (const std::size_t years : {std::size_t{20}, std::size_t{80}}) {
    std::vector<double> yearly(years);
    for (double& v : yearly) v = normal(random);
    const SeasonScores scores = score_season(YearlyValues(yearly).sample(), {5, 5, 20000});
    const Interval interval = at(scores, Score::bias).interval;
    // Central limit: 2 * 1.6449 * s / sqrt(n) with s over n, not n - 1. The 5th and 95th percentiles of 20 000 draws
    // are good to about 1 % of the width; the rest is for twenty years not being normal.
    const double n = static_cast<double>(years);
    const double expected = 2 * 1.6449 * std::sqrt(stats::variance(yearly) * (n - 1) / n / n);
    CHECK(std::fabs(interval.high - interval.low - expected) < 0.03 * expected);
  }
}

TEST_CASE("fewer than ten well-sampled years are too few; half a season's days make a year") {
  const Days days = invented::years(1991, 2000);
  auto observed = invented::rain(days, 5, 23);
  const auto modelled = invented::rain(days, 5, 24);
  const Options options{Quantity::precipitation};
  CHECK_FALSE(score_season(Sample(days, season("July"), options, observed, modelled), {1, 1, 5}).too_small);
  int left = 15;  // of 31: one less than half
  for (std::size_t i = 0; i < days.size(); ++i) {
    if (days.date(i).year == 1995 && days.date(i).month == 7 && left-- <= 0) observed[i] = kNaN;
  }
  const SeasonScores scores = score_season(Sample(days, season("July"), options, observed, modelled), {1, 1, 5});
  CHECK(scores.years == 9);
  CHECK(scores.days == 9 * 31 + 15);
  CHECK(scores.too_small);
  CHECK(score_season(Sample(days, season("DJF"), options, observed, modelled), {1, 1, 5}).years == 10);
}

TEST_CASE("nine in ten intervals hold the truth with many years, about 85 in 100 with ten") {
  std::mt19937_64 random(1979);
  std::normal_distribution<double> normal;
  for (const std::size_t years : {std::size_t{10}, std::size_t{40}}) {
    const int trials = 600;
    int held = 0;
    for (int trial = 0; trial < trials; ++trial) {
      std::vector<double> yearly(years);
      for (double& v : yearly) v = normal(random);
      const SeasonScores scores =
          score_season(YearlyValues(yearly).sample(), {9, static_cast<std::uint64_t>(trial), 300});
      held += at(scores, Score::bias).interval.low <= 0 && at(scores, Score::bias).interval.high >= 0;
    }
    const double share = static_cast<double>(held) / trials;
    // Expected 0.847 and 0.888 (normal interval with n for n - 1, Student's t with 9 and 39 degrees of freedom); three
    // standard errors of 600 trials are 0.044 and 0.039. Measured: 0.830 and 0.900.
    CHECK(std::fabs(share - (years == 10 ? 0.847 : 0.888)) < (years == 10 ? 0.044 : 0.039));
  }
}
