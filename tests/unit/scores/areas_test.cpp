// Laws of correlation against distance and of the extremes of areal means.
#include <doctest/doctest.h>

#include "series.h"
#include "windrow/base/error.h"
#include "windrow/scores/areas.h"

using namespace windrow;
using namespace windrow::scores;
using invented::kNaN;
using invented::season;

namespace {

const Resampling kFew{1, 1, 60};

Distance kilometres_apart(double km) {
  return [km](std::size_t i, std::size_t j) { return 1000 * km * std::fabs(double(i) - double(j)); };
}

/// Independent rain at each of `n` stations.
Field apart(const Days& days, std::size_t n, std::uint64_t seed) {
  Field field;
  for (std::size_t k = 0; k < n; ++k) field.push_back(invented::rain(days, 6, seed + k));
  return field;
}

}  // namespace

TEST_CASE("pairs of stations fall into their distance bins, and correlations are those worked by hand") {
  const calendar::Calendar calendar;
  const Days days(calendar, {{2001, 1, 1}, {2001, 1, 2}, {2001, 1, 3}, {2001, 2, 1}});
  const Field observed = {{1, 2, 3, 90}, {1, 3, 2, -7}, {3, 2, 1, 4}},
              modelled = {{1, 2, 3, 5}, {2, 4, 6, 5}, {0, 0, 1, 5}};
  const auto bins = correlation_by_distance(days, season("January"), observed, modelled, kilometres_apart(10),
                                            {0, 10e3, 20e3, 30e3}, 3);
  REQUIRE(bins.size() == 3);
  CHECK(bins[0].pairs == 0);  // 10 km belongs to the bin it opens
  CHECK(std::isnan(bins[0].observed));
  CHECK(bins[1].pairs == 2);
  CHECK(std::fabs(bins[1].observed - (0.5 - 0.5) / 2) < 1e-15);
  CHECK(std::fabs(bins[1].modelled - (1 + std::sqrt(0.75)) / 2) < 1e-15);
  CHECK(bins[2].pairs == 1);
  CHECK(std::fabs(bins[2].observed + 1) < 1e-15);
  const auto none =
      correlation_by_distance(days, season("January"), observed, modelled, kilometres_apart(10), {0, 10e3, 20e3}, 4);
  CHECK(none[1].pairs == 0);
  CHECK_THROWS_AS(
      (void)correlation_by_distance(days, season("January"), {{1, 2}}, {{1, 2}}, kilometres_apart(1), {0, 1}, 1),
      Error);
}

TEST_CASE("a day that one series of a pair lacks is left out of both correlations") {
  const Days days = invented::years(2001, 2003);
  Field observed = apart(days, 2, 40), modelled = apart(days, 2, 50);
  modelled[1] = modelled[0];
  for (std::size_t i = 0; i < days.size(); i += 5) {
    observed[0][i] = kNaN;
    modelled[1][i] = 1e6;  // not looked at
  }
  const auto bins = correlation_by_distance(days, season("year"), observed, modelled, kilometres_apart(1), {0, 2e3});
  CHECK(bins[0].modelled == doctest::Approx(1).epsilon(1e-14));
  CHECK(std::fabs(bins[0].observed) < 0.15);  // independent: five standard errors of 876 days are 0.17
}

TEST_CASE("a product equal to the observations may be used for areal extremes") {
  const Days days = invented::years(1991, 2005);
  const Field observed = apart(days, 4, 60);
  const AreaScores area = score_area(days, season("JJA"), observed, observed, {0, 1, 3}, kFew);
  CHECK(area.verdict == AreaVerdict::sound);
  CHECK(area.variance.value.value == 1);
  CHECK(area.percentile_95.value.value == 1);
  CHECK(area.yearly_maximum.value.value == 1);
  CHECK(area.yearly_maximum.interval.low == 1);
  CHECK(area.yearly_maximum.interval.high == 1);
  CHECK(area.sentence ==
        "JJA, mean of 3 stations: areal extremes may be used: product over observed is 1 for the variance, 1 for the "
        "95th "
        "percentile and 1 for Rx1day, all within 0.8 to 1.25");
}

TEST_CASE("one point's rain given to all cells overstates areal extremes and is refused") {
  const Days days = invented::years(1991, 2010);
  const Field observed = apart(days, 6, 70);
  const Field everywhere(6, invented::rain(days, 6, 99));  // the same distribution at each station, wet together
  const AreaScores area = score_area(days, season("year"), observed, everywhere, {0, 1, 2, 3, 4, 5}, kFew);
  CHECK(area.verdict == AreaVerdict::refused);
  // Independent stations: the mean's variance is a sixth of a station's.
  CHECK(area.variance.value.value > 5);
  CHECK(area.variance.value.value < 7);
  CHECK(area.variance.interval.low < area.variance.value.value);
  CHECK(area.variance.interval.high > area.variance.value.value);
  CHECK(area.yearly_maximum.value.value > 1.5);
  CHECK(area.sentence.find("do not use areal extremes") != std::string::npos);
}

TEST_CASE("without a complete year there is no Rx1day, and areal extremes are refused") {
  const Days days = invented::years(1991, 2005);
  Field observed = apart(days, 2, 75);
  for (std::size_t i = 0; i < days.size(); ++i) {
    if (days.date(i).month == 1 && days.date(i).day <= 16) observed[0][i] = kNaN;
  }
  const AreaScores area = score_area(days, season("year"), observed, observed, {0, 1}, kFew);
  CHECK(area.verdict == AreaVerdict::refused);
  CHECK(area.sentence ==
        "year, mean of 2 stations: do not use areal extremes: product over observed is 1 for the variance, 1 for the "
        "95th percentile and not to be had for Rx1day, not all within 0.8 to 1.25");
}

TEST_CASE("ratios of exactly 0.8 and 1.25 pass, the next ones do not") {
  const Days days = invented::years(1991, 2002);
  const Field observed(2, invented::rain(days, 8, 80));
  const auto scaled = [&observed](double factor) {
    Field field = observed;
    for (auto& series : field) {
      for (double& v : series) v *= factor;
    }
    return field;
  };
  // The variance goes with the square of the factor.
  const auto verdict = [&](double factor) {
    return score_area(days, season("year"), observed, scaled(factor), {0, 1}, kFew).verdict;
  };
  CHECK(verdict(std::sqrt(1.249)) == AreaVerdict::sound);
  CHECK(verdict(std::sqrt(1.251)) == AreaVerdict::refused);
  CHECK(verdict(std::sqrt(0.801)) == AreaVerdict::sound);
  CHECK(verdict(std::sqrt(0.799)) == AreaVerdict::refused);
}

TEST_CASE("few years, no common day and an empty group give no verdict on areas") {
  const Days days = invented::years(1991, 1999);
  Field observed = apart(days, 2, 90);
  const AreaScores few = score_area(days, season("year"), observed, observed, {0, 1}, kFew);
  CHECK(few.verdict == AreaVerdict::too_small);
  CHECK(few.sentence == "year, mean of 2 stations: sample too small: 9 years, at least 10 needed");
  CHECK(score_area(days, season("year"), observed, observed, {}, kFew).verdict == AreaVerdict::too_small);
  for (std::size_t i = 0; i < days.size(); ++i) observed[i % 2][i] = kNaN;
  const AreaScores none = score_area(days, season("year"), observed, observed, {0, 1}, kFew);
  CHECK(none.days == 0);
  CHECK(none.verdict == AreaVerdict::too_small);
  CHECK_THROWS_AS((void)score_area(days, season("year"), observed, {{1.0}}, {0}, kFew), Error);
}
