// Laws of seasons: who is evaluated where, and who is fitted with whom.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>

#include "windrow/base/error.h"
#include "windrow/calendar/seasons.h"

using namespace windrow;
using namespace windrow::calendar;

namespace {

std::vector<Calendar> calendars() {
  std::vector<Calendar> result;
  for (const char* name : {"standard", "noleap", "all_leap", "360_day", "julian"}) {
    result.push_back(Calendar::from_cf(name, ""));
  }
  result.push_back(Calendar::custom({34, 31, 32, 30, 29, 27, 28, 28, 28, 32, 32, 34}, 0, 2));
  return result;
}

/// Calls action(date) for each day of the year.
void each_day(const Calendar& calendar, int year, const auto& action) {
  const std::int64_t first = calendar.day_number({year, 1, 1});
  for (int day = 0; day < calendar.days_in_year(year); ++day) action(calendar.date(first + day));
}

}  // namespace

TEST_CASE("there is a window for every step of the year") {
  CHECK(Seasons::moving(31, 5).count() == 73);
  CHECK(Seasons::moving(31, 1).count() == 365);
  CHECK(Seasons::moving(31, 7).count() == 53);
  CHECK(Seasons::moving(31, 365).count() == 1);
  CHECK(Seasons::by_month().count() == 12);
  CHECK(Seasons::by_year().count() == 1);
  CHECK(Seasons::moving(31, 7).name(2) == "window about day 15");
  CHECK(Seasons::by_month().name(0) == "January");
  CHECK(Seasons::by_year().name(0) == "year");
}

TEST_CASE("a day is evaluated with the nearest centre and is in that season's fitting sample") {
  for (const Calendar& calendar : calendars()) {
    for (const auto& window :
         {std::pair{31, 5}, {31, 1}, {30, 30}, {31, 31}, {7, 7}, {1, 1}, {91, 10}, {366, 5}}) {
      const int width = window.first, step = window.second;
      const Seasons seasons = Seasons::moving(width, step);
      for (const int year : {1999, 2000}) {
        each_day(calendar, year, [&](Date date) {
          const int season = seasons.evaluation_season(calendar, date);
          REQUIRE(season >= 0);
          REQUIRE(season < seasons.count());
          // Brute force in floating point: distance on the circle of the year.
          const double at = calendar.year_fraction(date);
          const auto away = [&](int s) {
            const double d = std::fabs(at - (s * step + 0.5) / 365);
            return std::min(d, 1 - d);
          };
          for (int other = 0; other < seasons.count(); ++other) REQUIRE(away(season) <= away(other) + 1e-12);
          std::vector<int> fitting;
          seasons.fitting_seasons(calendar, date, fitting);
          REQUIRE(std::is_sorted(fitting.begin(), fitting.end()));
          REQUIRE(std::binary_search(fitting.begin(), fitting.end(), season));
        });
      }
    }
  }
}

TEST_CASE("a fitting sample holds its width in days: exactly in 365 days, in proportion in other years") {
  for (const Calendar& calendar : calendars()) {
    for (const auto& [width, step] : {std::pair{31, 5}, {30, 5}, {31, 1}, {7, 7}, {2, 2}, {91, 10}}) {
      const Seasons seasons = Seasons::moving(width, step);
      for (const int year : {1999, 2000}) {
        std::vector<int> days(static_cast<std::size_t>(seasons.count()));
        each_day(calendar, year, [&](Date date) {
          std::vector<int> fitting;
          seasons.fitting_seasons(calendar, date, fitting);
          for (const int season : fitting) ++days[static_cast<std::size_t>(season)];
        });
        const double share = width * calendar.days_in_year(year) / 365.0;
        for (const int count : days) {
          REQUIRE(count >= std::floor(share));
          REQUIRE(count <= std::ceil(share));
        }
      }
    }
  }
}

TEST_CASE("an odd window reaches equally far to both sides, round the year's end") {
  const Calendar noleap = Calendar::from_cf("noleap", "");
  const Seasons seasons = Seasons::moving(31, 5);
  for (int season = 0; season < seasons.count(); ++season) {
    each_day(noleap, 2001, [&](Date date) {
      std::vector<int> fitting;
      seasons.fitting_seasons(noleap, date, fitting);
      const int away = std::abs(noleap.day_of_year(date) - (season * 5 + 1));
      REQUIRE(std::binary_search(fitting.begin(), fitting.end(), season) == (std::min(away, 365 - away) <= 15));
    });
  }
}

TEST_CASE("between two centres the earlier wins a tie") {
  const Calendar noleap = Calendar::from_cf("noleap", "");
  const Seasons seasons = Seasons::moving(31, 2);
  CHECK(seasons.evaluation_season(noleap, {2001, 1, 1}) == 0);
  CHECK(seasons.evaluation_season(noleap, {2001, 1, 2}) == 0);
  CHECK(seasons.evaluation_season(noleap, {2001, 1, 3}) == 1);
  // Day 363 is centre 181, day 365 centre 182; day 364 lies between.
  CHECK(seasons.evaluation_season(noleap, {2001, 12, 30}) == 181);
  // With a step of 3 the last centre is day 364, the next the following day 1: day 365 lies between.
  CHECK(Seasons::moving(31, 3).evaluation_season(noleap, {2001, 12, 31}) == 121);
}

TEST_CASE("29 February is evaluated once, like its neighbours") {
  const Calendar standard;
  const Seasons seasons = Seasons::moving(31, 5);
  const int before = seasons.evaluation_season(standard, {2000, 2, 28});
  const int leap = seasons.evaluation_season(standard, {2000, 2, 29});
  const int after = seasons.evaluation_season(standard, {2000, 3, 1});
  CHECK(before <= leap);
  CHECK(leap <= after);
  CHECK(after - before <= 1);
  CHECK(Seasons::by_month().evaluation_season(standard, {2000, 2, 29}) == 1);
}

TEST_CASE("months and the year are their own fitting samples") {
  const Calendar standard;
  std::vector<int> fitting = {7, 8, 9};
  Seasons::by_month().fitting_seasons(standard, {1999, 12, 31}, fitting);
  CHECK(fitting == std::vector<int>{11});
  Seasons::by_year().fitting_seasons(standard, {1999, 12, 31}, fitting);
  CHECK(fitting == std::vector<int>{0});
}

TEST_CASE("windows without days are refused") {
  CHECK_THROWS_WITH_AS(Seasons::moving(0, 5), "season: a window of 0 days; expected 1 to 366 days", Error);
  CHECK_THROWS_WITH_AS(Seasons::moving(31, 0), "day_step: 0 days between windows; expected 1 to 365", Error);
  CHECK_THROWS_AS(Seasons::moving(367, 5), Error);
  CHECK_THROWS_AS(Seasons::moving(31, 366), Error);
}
