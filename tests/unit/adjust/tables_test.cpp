// Laws of the tables behind the transfers: exponential, smoothing of months, steps, ranks.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>

#include "adjust/det_exp.h"
#include "adjust/ranking.h"
#include "invented.h"
#include "windrow/base/error.h"

namespace windrow::adjust {

using invented::cal;
using invented::Random;

TEST_CASE("det_exp agrees with long double to 1e-15, and is exact at 0") {
  Random random(3);
  long double worst = 0;
  for (int i = 0; i < 200000; ++i) {
    const double x = i % 2 ? 1400 * random() - 700 : 20 * random() - 10;
    const long double truth = std::exp(static_cast<long double>(x));
    worst = std::max(worst, std::abs((static_cast<long double>(det_exp(x)) - truth) / truth));
  }
  INFO("largest relative error " << static_cast<double>(worst));
  CHECK(worst < 1e-15L);
  CHECK(det_exp(0) == 1);
  CHECK(std::isnan(det_exp(std::nan(""))));
  CHECK(det_exp(1e6) == det_exp(700));
}

TEST_CASE("smoothed months keep every month's mean and constants, in every calendar") {
  for (const char* name : {"standard", "noleap", "all_leap", "360_day", "julian"}) {
    const auto calendar = cal(name);
    const auto table = MonthSmoothing::of(calendar);
    std::vector<double> daily(table->slots());
    Random random(7);
    for (int round = 0; round < 5; ++round) {
      std::vector<double> monthly(12);
      for (double& v : monthly) v = round == 0 ? 3.25 : 10 * random() - 5;
      table->spread(monthly, daily);
      for (int year = 1999; year <= 2004; ++year) {
        for (int m = 1; m <= 12; ++m) {
          double sum = 0, constant = 0;
          const int length = calendar.days_in_month(year, m);
          for (int d = 1; d <= length; ++d) {
            const double v = daily[static_cast<std::size_t>(table->slot(calendar, {year, m, d}))];
            sum += v;
            constant = std::max(constant, std::abs(v - 3.25));
          }
          CHECK(std::abs(sum / length - monthly[static_cast<std::size_t>(m - 1)]) < 5e-12);
          if (round == 0) CHECK(constant < 1e-12);
        }
      }
    }
  }
}

TEST_CASE("smoothed months have no steps: a cosine course comes back within 2 percent of its amplitude") {
  const auto calendar = cal("noleap");
  const auto table = MonthSmoothing::of(calendar);
  const auto dates = invented::days(calendar, 2001, 2001);
  std::vector<double> monthly(12, 0.0), daily(table->slots());
  for (const auto& date : dates) {
    monthly[static_cast<std::size_t>(date.month - 1)] +=
        std::cos(6.283185307179586 * calendar.year_fraction(date)) / calendar.days_in_month(date.year, date.month);
  }
  table->spread(monthly, daily);
  double worst = 0;
  for (const auto& date : dates) {
    const double v = daily[static_cast<std::size_t>(table->slot(calendar, date))];
    worst = std::max(worst, std::abs(v - std::cos(6.283185307179586 * calendar.year_fraction(date))));
  }
  INFO("largest departure " << worst);
  CHECK(worst < 0.02);
}

TEST_CASE("a user-defined calendar has its own slots behind the common ones") {
  const auto calendar = calendar::Calendar::custom({34, 31, 32, 30, 29, 27, 28, 28, 28, 32, 32, 34}, 0, 2);
  const auto table = MonthSmoothing::of(calendar);
  CHECK(table->slots() == 365 + 366 + 360 + 365);
  CHECK(table->slot(calendar, {5, 1, 1}) == 1091);
  CHECK(table->slot(calendar, {5, 12, 34}) == 1091 + 364);
  CHECK(table->months()[1091 + 364] == 11);
  CHECK(MonthSmoothing::of(cal("noleap"))->slots() == 1091);
}

TEST_CASE("steps: the sample of every season lies in the period, members need not") {
  Setup setup;
  setup.method = Method::quantile_mapping;
  setup.seasons = calendar::Seasons::moving(31, 5);
  const auto calendar = cal("noleap");
  const auto dates = invented::days(calendar, 1990, 1993);
  const auto period = std::make_pair(calendar::Date{1991, 1, 1}, calendar::Date{1992, 12, 31});
  const Steps steps = make_steps(setup, calendar, dates, period, true, "run heron");
  REQUIRE(steps.sample.start.size() == static_cast<std::size_t>(setup.seasons.count()) + 1);
  for (std::size_t s = 0; s + 1 < steps.sample.start.size(); ++s) {
    CHECK(steps.sample.start[s + 1] - steps.sample.start[s] == 2 * 31);
    CHECK(steps.member.start[s + 1] - steps.member.start[s] == 4 * 31);
  }
  CHECK(
      std::all_of(steps.sample.step.begin(), steps.sample.step.end(), [&](auto t) { return steps.in_period[t] == 1; }));
  CHECK(std::count(steps.in_period.begin(), steps.in_period.end(), 1) == 730);
  CHECK(steps.slot[0] == -1);
  const Steps other = make_steps(setup, calendar, dates, period, false, "run heron");
  CHECK(other.season == steps.season);
  CHECK(other.sample.step.empty());
}

TEST_CASE("steps: errors name place, season and what to do") {
  Setup setup;
  const auto calendar = cal("standard");
  const auto dates = invented::days(calendar, 1990, 1990);
  const auto period = std::make_pair(calendar::Date{1990, 2, 1}, calendar::Date{1990, 12, 31});
  CHECK_THROWS_WITH_AS(make_steps(setup, calendar, dates, period, true, "run heron"),
                       "run heron: no step of the calibration period falls into January; choose a period that the "
                       "anchor run covers",
                       Error);
  CHECK_NOTHROW(make_steps(setup, calendar, dates, period, false, "run heron"));
  setup.daily = false;
  setup.seasons = calendar::Seasons::by_year();
  CHECK_THROWS_WITH_AS(make_steps(setup, calendar, dates, {}, true, "run heron"),
                       "run heron: monthly model data need season = \"month\"", Error);
  setup = {};
  setup.method = Method::quantile_mapping;
  setup.quantiles = 1;
  CHECK_THROWS_WITH_AS(make_steps(setup, calendar, dates, {}, true, "run heron"),
                       "run heron: quantiles must be 2 to 65535", Error);
}

TEST_CASE("standings agree with a plain search, rise with the value and lie in the middle of ties") {
  Random random(17);
  for (int round = 0; round < 200; ++round) {
    std::vector<double> nodes(static_cast<std::size_t>(2 + 60 * random()));
    for (double& v : nodes) v = std::floor(20 * random());
    std::sort(nodes.begin(), nodes.end());
    NodeRow row;
    row.set(nodes);
    double before = -1;
    for (double x = -1; x <= 21; x += 0.25) {
      const std::size_t below = row.count_below(x);
      CHECK(below == static_cast<std::size_t>(std::upper_bound(nodes.begin(), nodes.end(), x) - nodes.begin()));
      const Standing place = row.standing(x, below);
      CHECK(place.node + 2u <= nodes.size());
      const double position = place.node + static_cast<double>(place.weight);
      CHECK(position >= before);
      before = position;
      const auto equal = std::equal_range(nodes.begin(), nodes.end(), x);
      if (equal.first != equal.second) {
        CHECK(position == static_cast<double>((equal.first - nodes.begin()) + (equal.second - nodes.begin()) - 1) / 2);
      }
    }
  }
}

}  // namespace windrow::adjust
