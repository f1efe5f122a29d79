// Laws and hand-worked values of the scores of one station.
#include <doctest/doctest.h>

#include <algorithm>

#include "series.h"
#include "windrow/base/error.h"

using namespace windrow;
using namespace windrow::scores;
using invented::kNaN;
using invented::season;

namespace {

constexpr Options kRain{Quantity::precipitation, true, 1.0};
constexpr Options kTemperature{Quantity::temperature, true, 1.0};

Days january(int days) {
  std::vector<calendar::Date> dates;
  for (int day = 1; day <= days; ++day) dates.push_back({2001, 1, day});
  return Days(calendar::Calendar(), dates);
}

bool near(double found, double expected, double bound) { return std::fabs(found - expected) <= bound; }

}  // namespace

TEST_CASE("five days of rain give the scores worked by hand") {
  const std::vector<double> observed = {0, 2, 4, 0, 0.5}, modelled = {1, 2, 7, 0, 0};
  const Days days = january(5);
  const Sample sample(days, season("January"), kRain, observed, modelled);
  const Values values = sample.scores();
  CHECK(sample.days() == 5);
  CHECK(near(at(values, Score::bias).observed, 1.3, 1e-15));
  CHECK(near(at(values, Score::bias).modelled, 2, 1e-15));
  CHECK(near(at(values, Score::bias).value, 0.7, 1e-15));
  CHECK(near(at(values, Score::mean_absolute_error).value, 0.9, 1e-15));
  CHECK(near(at(values, Score::root_mean_square_error).value, std::sqrt(10.25 / 5), 1e-15));
  // Squared departures: observed 20.25 - 6.5^2/5 = 11.8; modelled 54 - 100/5 = 34.
  CHECK(near(at(values, Score::variance_ratio).observed, 11.8 / 4, 1e-14));
  CHECK(near(at(values, Score::variance_ratio).value, 34 / 11.8, 1e-14));
  CHECK(at(values, Score::percentile_50).observed == 0.5);
  CHECK(at(values, Score::percentile_50).modelled == 1);
  CHECK(near(at(values, Score::percentile_95).value, (2 + 0.8 * 5) - (2 + 0.8 * 2), 1e-14));
  // Wet: observed 2 of 5; modelled 3 of 5, a day with exactly the threshold is wet.
  CHECK(near(at(values, Score::wet_day_frequency).value, 0.2, 1e-15));
  // Bins of 1 mm/day. Observed: 3 in [0,1), 1 in [2,3), 1 in [4,5); modelled: 2, 1 in [1,2), 1 in [2,3), 1 in [7,8).
  CHECK(near(at(values, Score::perkins).value, 0.6, 1e-15));
  // A month of five days of 31 is not complete.
  CHECK(std::isnan(at(values, Score::yearly_maximum).value));
  CHECK(std::isnan(at(values, Score::longest_dry_spell).value));
  CHECK(std::isnan(at(values, Score::yearly_minimum).value));
}

TEST_CASE("autocorrelation takes pairs of neighbouring days only") {
  // Days 1-3 and 5-6; pairs (1,2), (2,3), (5,6): x = 1, 2, 5 and y = 2, 4, 6. Covariance sum 9, x: 26/3, y: 8.
  const std::vector<double> observed = {1, 2, 4, kNaN, 5, 6}, flat(6, 0.1);
  const Values values = Sample(january(6), season("January"), kTemperature, observed, flat).scores();
  const double sum_x = 8.0 / 3, sum_y = 4;
  const double covariance = (1 - sum_x) * (2 - sum_y) + (2 - sum_x) * 0 + (5 - sum_x) * 2;
  CHECK(near(at(values, Score::autocorrelation).observed, covariance / std::sqrt(26.0 / 3 * 8), 1e-14));
  CHECK(std::isnan(at(values, Score::autocorrelation).modelled));  // a constant has none
  CHECK(at(values, Score::variance_ratio).modelled == 0);
  CHECK(at(values, Score::variance_ratio).value == 0);
}

TEST_CASE("extremes and dry spells are means over complete years") {
  const Days days = invented::years(2001, 2003);
  std::vector<double> observed(days.size(), 2.0), modelled(days.size(), 2.0);
  for (std::size_t i = 0; i < days.size(); ++i) {
    const calendar::Date date = days.date(i);
    if (date.month != 7) continue;
    if (date.year == 2001 && date.day <= 4) observed[i] = 0;                       // spell of 4
    if (date.year == 2001 && date.day >= 10 && date.day < 20) observed[i] = 0.99;  // spell of 10
    if (date.year == 2001 && date.day == 25) observed[i] = 30;
    if (date.year == 2002 && date.day <= 4) observed[i] = kNaN;  // four missing days: not complete
    if (date.year == 2002 && date.day == 9) observed[i] = 500;
    if (date.year == 2003 && date.day == 10) observed[i] = kNaN;  // ends the spell; a year may miss three days
    if (date.year == 2003 && date.day > 3 && date.day < 18 && date.day != 10) observed[i] = 0;
  }
  const Values july = Sample(days, season("July"), kRain, observed, modelled).scores();
  CHECK(at(july, Score::yearly_maximum).observed == (30 + 2) / 2.0);
  CHECK(at(july, Score::yearly_maximum).value == -14);
  CHECK(at(july, Score::longest_dry_spell).observed == (10 + 7) / 2.0);
  CHECK(at(july, Score::longest_dry_spell).modelled == 0);
  const Values year = Sample(days, season("year"), kRain, observed, modelled).scores();
  CHECK(at(year, Score::yearly_maximum).observed == (30 + 500 + 2) / 3.0);  // a year may miss fifteen days
  const Values lowest = Sample(days, season("July"), kTemperature, observed, modelled).scores();
  CHECK(at(lowest, Score::yearly_minimum).observed == 0);
  CHECK(std::isnan(at(lowest, Score::wet_day_frequency).value));
  CHECK(std::isnan(at(lowest, Score::longest_dry_spell).value));
}

TEST_CASE("a perfect series has perfect scores in every season") {
  const Days days = invented::years(1991, 2002);
  for (const Options& options : {kTemperature, kRain}) {
    const bool wet = options.quantity == Quantity::precipitation;
    std::vector<double> series = wet ? invented::rain(days, 6, 1) : invented::temperature(days, 283, 3, 2);
    for (std::size_t i = 0; i < series.size(); i += 97) series[i] = kNaN;
    for (const Season& one : standard_seasons()) {
      CAPTURE(one.name);
      const Sample sample(days, one, options, series, series);
      const Values values = sample.scores();
      for (std::size_t s = 0; s < kScores; ++s) {
        const auto score = static_cast<Score>(s);
        CAPTURE(name(score));
        if (!sample.has(score)) {
          CHECK(std::isnan(values[s].value));
          continue;
        }
        CHECK(values[s].value == perfect(score));
        CHECK(departure(score, values[s].value) == 0);
      }
    }
  }
}

TEST_CASE("a constant added to the model moves means, quantiles and extremes by it and leaves spread and order") {
  const Days days = invented::years(1991, 1998);
  const auto observed = invented::temperature(days, 10, 3, 3);
  auto modelled = invented::temperature(days, 11, 4, 4);
  const Values before = Sample(days, season("JJA"), kTemperature, observed, modelled).scores();
  for (double& v : modelled) v += 2.5;  // five bins of 0.5 K
  const Values after = Sample(days, season("JJA"), kTemperature, observed, modelled).scores();
  // Sums over at most 736 days of values below 40: 1e-11 is a hundredfold of their rounding.
  for (const Score score : {Score::bias, Score::percentile_5, Score::percentile_50, Score::percentile_95,
                            Score::percentile_99, Score::yearly_maximum, Score::yearly_minimum}) {
    CAPTURE(name(score));
    CHECK(near(at(after, score).value, at(before, score).value + 2.5, 1e-11));
  }
  for (const Score score : {Score::variance_ratio, Score::autocorrelation}) {
    CHECK(near(at(after, score).value, at(before, score).value, 1e-11));
  }
  auto both = observed;
  for (double& v : both) v += 2.5;
  const Values moved = Sample(days, season("JJA"), kTemperature, both, modelled).scores();
  CHECK(near(at(moved, Score::bias).value, at(before, Score::bias).value, 1e-11));
  CHECK(at(moved, Score::perkins).value == at(before, Score::perkins).value);
}

TEST_CASE("scores of distributions do not see the order of the modelled days, scores of days do") {
  const Days days = invented::years(1991, 1994);
  const auto observed = invented::rain(days, 5, 5);
  auto modelled = invented::rain(days, 7, 6);
  const Values before = Sample(days, season("year"), kRain, observed, modelled).scores();
  std::mt19937_64 random(7);
  std::shuffle(modelled.begin(), modelled.end(), random);
  const Values after = Sample(days, season("year"), kRain, observed, modelled).scores();
  for (const Score score : {Score::percentile_5, Score::percentile_50, Score::percentile_95, Score::percentile_99,
                            Score::wet_day_frequency, Score::perkins}) {
    CHECK(at(after, score).value == at(before, score).value);
  }
  CHECK(near(at(after, Score::bias).value, at(before, Score::bias).value, 1e-12));
  CHECK(near(at(after, Score::variance_ratio).value, at(before, Score::variance_ratio).value, 1e-12));
  CHECK(at(after, Score::mean_absolute_error).value != at(before, Score::mean_absolute_error).value);
}

TEST_CASE("exchanging the series turns differences round and leaves Perkins and the errors of days") {
  const Days days = invented::years(1991, 1994);
  const auto a = invented::rain(days, 5, 8), b = invented::rain(days, 7, 9);
  const Values there = Sample(days, season("SON"), kRain, a, b).scores();
  const Values back = Sample(days, season("SON"), kRain, b, a).scores();
  for (std::size_t s = 0; s < kScores; ++s) {
    const auto score = static_cast<Score>(s);
    CAPTURE(name(score));
    if (score == Score::perkins || score == Score::mean_absolute_error || score == Score::root_mean_square_error) {
      CHECK(there[s].value == back[s].value);
    } else if (score == Score::variance_ratio) {
      CHECK(near(there[s].value * back[s].value, 1, 1e-14));
    } else if (score != Score::yearly_minimum) {
      CHECK(there[s].value == -back[s].value);
    }
  }
}

TEST_CASE("days missing in one series count in neither") {
  const Days days = invented::years(1991, 1993);
  auto observed = invented::rain(days, 5, 10), modelled = invented::rain(days, 5, 11);
  observed[40] = kNaN;
  modelled[100] = kNaN;
  auto shorter_observed = observed, shorter_modelled = modelled;
  shorter_observed[100] = shorter_modelled[40] = kNaN;
  const Values one = Sample(days, season("year"), kRain, observed, modelled).scores();
  const Values other = Sample(days, season("year"), kRain, shorter_observed, shorter_modelled).scores();
  for (std::size_t s = 0; s < kScores; ++s) {
    CHECK((one[s].value == other[s].value || (std::isnan(one[s].value) && std::isnan(other[s].value))));
  }
}

TEST_CASE("errors of days are scored only where days correspond") {
  const Days days = invented::years(1991, 1991);
  const auto series = invented::rain(days, 5, 12);
  const Options free{Quantity::precipitation, false, 1.0};
  const Values values = Sample(days, season("year"), free, series, series).scores();
  CHECK(std::isnan(at(values, Score::mean_absolute_error).value));
  CHECK(std::isnan(at(values, Score::root_mean_square_error).value));
  CHECK(at(values, Score::bias).value == 0);
}

TEST_CASE("an empty season has no scores, and series of another length are a defect") {
  const Days days = january(5);
  const std::vector<double> series(5, 1.0), shorter(4, 1.0), missing(5, kNaN);
  const Sample empty(days, season("July"), kRain, series, series),
      none(days, season("January"), kRain, series, missing);
  for (const Sample* sample : {&empty, &none}) {
    CHECK(sample->days() == 0);
    CHECK(sample->years().empty());
    for (const Value& value : sample->scores()) CHECK(std::isnan(value.value));
  }
  CHECK_THROWS_AS(Sample(days, season("January"), kRain, series, shorter), Error);
  const Sample sample(days, season("January"), kRain, series, series);
  CHECK_THROWS_AS((void)sample.scores(std::vector<int>{1, 1}), Error);
}

TEST_CASE("a year taken twice is that year written down twice") {
  // 360-day years: a copy of 1991 as 1993 has the same days.
  const Days two = invented::years(1991, 1992, "360_day"), three = invented::years(1991, 1993, "360_day");
  const auto observed = invented::rain(two, 5, 13), modelled = invented::rain(two, 6, 14);
  auto longer_observed = observed, longer_modelled = modelled;
  for (std::size_t i = 0; i < 360; ++i) {
    longer_observed.push_back(observed[i]);
    longer_modelled.push_back(modelled[i]);
  }
  const Values drawn = Sample(two, season("year"), kRain, observed, modelled).scores(std::vector<int>{2, 1});
  const Values written = Sample(three, season("year"), kRain, longer_observed, longer_modelled).scores();
  for (std::size_t s = 0; s < kScores; ++s) {
    CAPTURE(s);
    if (std::isnan(written[s].value)) {
      CHECK(std::isnan(drawn[s].value));
    } else {
      CHECK(near(drawn[s].value, written[s].value, 1e-12));
    }
  }
}
