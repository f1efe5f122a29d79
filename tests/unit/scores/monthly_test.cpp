// Laws of means of months and their errors. All series are invented.
#include "windrow/scores/monthly.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>

#include "windrow/base/error.h"

using namespace windrow;
using namespace windrow::scores;

namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

struct Daily {
  calendar::Calendar calendar = calendar::Calendar::from_cf("proleptic_gregorian", "test");
  std::vector<calendar::Date> dates;
  std::vector<double> values;

  /// Days of 2003 and 2004 whose value is their month.
  Daily() {
    for (auto day = calendar.day_number({2003, 1, 1}); day < calendar.day_number({2005, 1, 1}); ++day) {
      dates.push_back(calendar.date(day));
      values.push_back(dates.back().month);
    }
  }
};

}  // namespace

TEST_CASE("a month's mean is that of its days, and one missing day does not cost the month") {
  Daily daily;
  daily.values[0] = kNone;                      // 1 January 2003
  daily.values[31] = daily.values[32] = kNone;  // 1 and 2 February
  const auto means = month_means(daily.calendar, daily.dates, daily.values, true);
  REQUIRE(means.size() == 23);
  CHECK(means[0].month == 1);
  CHECK(means[0].value == 1);
  CHECK(means[1].month == 3);
  CHECK(means[1].year == 2003);
  CHECK(means.back().year == 2004);
  CHECK(means.back().value == 12);
}

TEST_CASE("monthly series have one value a month") {
  const auto calendar = calendar::Calendar::from_cf("360_day", "test");
  const std::vector<calendar::Date> dates{{2005, 1, 16}, {2005, 2, 16}, {2005, 3, 16}};
  const std::vector<double> values{1.5, kNone, -2};
  const auto means = month_means(calendar, dates, values, false);
  REQUIRE(means.size() == 2);
  CHECK(means[1].month == 3);
  CHECK(means[1].value == -2);
  CHECK_THROWS_AS(month_means(calendar, dates, std::vector<double>{1.0}, false), Error);
}

TEST_CASE("only months that both have count") {
  const std::vector<MonthOfYear> observed{{2001, 1, 1}, {2001, 2, 5}, {2002, 1, 3}, {2003, 1, 100}};
  const std::vector<MonthOfYear> modelled{{2000, 12, 9}, {2001, 1, 2}, {2002, 1, 6}, {2002, 2, 7}};
  const auto means = common_means(observed, modelled);
  CHECK(means.observed[0] == 2);
  CHECK(means.modelled[0] == 4);
  for (std::size_t m = 1; m < 12; ++m) {
    CAPTURE(m);
    CHECK(std::isnan(means.observed[m]));
    CHECK(std::isnan(means.modelled[m]));
  }
}

TEST_CASE("errors are means over the stations that have the month, and then over months") {
  MonthMeans none{};
  none.observed.fill(kNone);
  none.modelled.fill(kNone);
  MonthMeans warm = none, cold = none;
  warm.observed[0] = 10;
  warm.modelled[0] = 12;
  cold.observed[0] = 5;
  cold.modelled[0] = 4;
  warm.observed[6] = 20;
  warm.modelled[6] = 20.5;
  const auto errors = month_errors(std::vector<MonthMeans>{warm, cold, none});
  CHECK(errors.stations[0] == 2);
  CHECK(errors.mean_absolute[0] == 1.5);
  CHECK(errors.bias[0] == 0.5);
  CHECK(errors.stations[6] == 1);
  CHECK(errors.mean_absolute[6] == 0.5);
  CHECK(errors.mean_absolute_mean == 1.0);
  CHECK(errors.bias_mean == 0.5);
  CHECK(std::isnan(errors.bias[1]));
  CHECK(std::isnan(month_errors(std::vector<MonthMeans>{none}).mean_absolute_mean));
  CHECK(std::isnan(month_errors({}).bias_mean));
}
