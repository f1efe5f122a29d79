// Laws of seasons as sets of months and of the days in them.
#include <doctest/doctest.h>

#include "series.h"
#include "windrow/base/error.h"

using namespace windrow;
using namespace windrow::scores;
using invented::season;

TEST_CASE("there are seventeen standard seasons, and each month is in one month, one quarter and the year") {
  const auto all = standard_seasons();
  REQUIRE(all.size() == 17);
  CHECK(all[0].name == "January");
  CHECK(all[12].name == "DJF");
  CHECK(all[16].name == "year");
  for (std::size_t month = 0; month < 12; ++month) {
    int seasons = 0;
    for (const Season& one : all) seasons += one.has_month[month];
    CHECK(seasons == 3);
  }
  CHECK(season("SON").has_month == std::array<bool, 12>{0, 0, 0, 0, 0, 0, 0, 0, 1, 1, 1, 0});
}

TEST_CASE("December counts with the winter that follows, and only there") {
  CHECK(season("DJF").year_of(2000, 12) == 2001);
  CHECK(season("DJF").year_of(2001, 1) == 2001);
  CHECK(season("year").year_of(2000, 12) == 2000);
  CHECK(season("December").year_of(2000, 12) == 2000);
  // October stands apart from the run of months that leads into January.
  const Season odd{"odd", {1, 0, 0, 0, 0, 0, 0, 0, 0, 1, 0, 1}};
  CHECK(odd.year_of(2000, 10) == 2000);
  CHECK(odd.year_of(2000, 12) == 2001);
  const Season winter{"NDJFM", {1, 1, 1, 0, 0, 0, 0, 0, 0, 0, 1, 1}};
  CHECK(winter.year_of(2000, 11) == 2001);
}

TEST_CASE("a season's length follows the calendar and its leap days") {
  const Days days = invented::years(1999, 2001);
  CHECK(days.length(season("DJF"), 2000) == 91);
  CHECK(days.length(season("DJF"), 2001) == 90);
  CHECK(days.length(season("year"), 2000) == 366);
  CHECK(days.length(season("February"), 1900) == 28);
  const Days equal = invented::years(1999, 2001, "360_day");
  CHECK(equal.length(season("DJF"), 2000) == 90);
  CHECK(equal.length(season("year"), 2000) == 360);
}

TEST_CASE("dates that do not ascend or do not exist are refused; a gap is no step") {
  const calendar::Calendar standard;
  CHECK_THROWS_AS(Days(standard, {{2001, 1, 2}, {2001, 1, 2}}), Error);
  CHECK_THROWS_AS(Days(standard, {{2001, 2, 1}, {2001, 1, 31}}), Error);
  CHECK_THROWS_AS(Days(standard, {{2001, 2, 29}}), Error);
  const Days days(standard, {{2001, 2, 27}, {2001, 2, 28}, {2001, 3, 1}, {2001, 3, 3}});
  CHECK_FALSE(days.follows(0));
  CHECK(days.follows(1));
  CHECK(days.follows(2));
  CHECK_FALSE(days.follows(3));
}
