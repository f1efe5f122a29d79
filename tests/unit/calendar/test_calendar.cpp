// Laws of calendars and dates.
#include <doctest/doctest.h>

#include <random>

#include "windrow/base/error.h"
#include "windrow/calendar/calendar.h"

using namespace windrow;
using namespace windrow::calendar;

namespace {

std::vector<Calendar> all_calendars() {
  std::vector<Calendar> result;
  for (const char* name :
       {"standard", "proleptic_gregorian", "julian", "noleap", "all_leap", "360_day", "utc", "tai"}) {
    result.push_back(Calendar::from_cf(name, "test"));
  }
  // CF 1.13 example 4.6 (month lengths from memory): the calendar of 126 kyr before present; the second with leap days.
  result.push_back(Calendar::custom({34, 31, 32, 30, 29, 27, 28, 28, 28, 32, 32, 34}, 0, 2));
  result.push_back(Calendar::custom({34, 31, 32, 30, 29, 27, 28, 28, 28, 32, 32, 34}, 3, 7));
  return result;
}

std::string message(const auto& action) {
  try {
    action();
  } catch (const Error& error) {
    CHECK(error.kind() == Failure::data);
    return error.what();
  }
  return "no error";
}

}  // namespace

TEST_CASE("day numbers and dates are inverse to each other in every calendar, years before zero included") {
  std::mt19937_64 random(20240229);
  for (const Calendar& calendar : all_calendars()) {
    for (int i = 0; i < 20000; ++i) {
      const std::int64_t span = i % 2 == 0 ? 1'000'000 : 30'000'000;
      const auto number = static_cast<std::int64_t>(random() % (2 * span)) - span;
      const Date date = calendar.date(number);
      REQUIRE(calendar.valid(date));
      REQUIRE(calendar.day_number(date) == number);
    }
  }
}

TEST_CASE("days follow one another: the next day number is the next day, month or year") {
  for (const Calendar& calendar : all_calendars()) {
    Date last = calendar.date(-3000);
    for (std::int64_t number = -2999; number < 800'000; ++number) {
      const Date date = calendar.date(number);
      const bool next_day = date.year == last.year && date.month == last.month && date.day == last.day + 1;
      // October 1582 is 21 days long in standard, and ends on the 31st.
      const bool short_month = calendar.kind() == Calendar::Kind::standard && last == Date{1582, 10, 31};
      const bool last_of_month = last.day == calendar.days_in_month(last.year, last.month) || short_month;
      const bool next_month = date.day == 1 && date.year == last.year && date.month == last.month + 1 && last_of_month;
      const bool next_year = date.day == 1 && date.month == 1 && date.year == last.year + 1 && last.month == 12;
      const bool change =
          last == Date{1582, 10, 4} && date == Date{1582, 10, 15} && calendar.kind() == Calendar::Kind::standard;
      REQUIRE((next_day || next_month || next_year || change));
      last = date;
    }
  }
}

TEST_CASE("day zero is 0000-01-01 in every calendar") {
  for (const Calendar& calendar : all_calendars()) CHECK(calendar.day_number({0, 1, 1}) == 0);
}

TEST_CASE("months fill the year and the last day of the year is its length") {
  for (const Calendar& calendar : all_calendars()) {
    for (int year = -20; year < 2500; ++year) {
      int days = 0;
      for (int month = 1; month <= 12; ++month) days += calendar.days_in_month(year, month);
      REQUIRE(days == calendar.days_in_year(year));
      REQUIRE(calendar.day_of_year(calendar.date(calendar.day_number({year + 1, 1, 1}) - 1)) == days);
    }
  }
}

TEST_CASE("the standard calendar goes from 1582-10-04 to 1582-10-15 (CF 1.13, section 4.4)") {
  const Calendar standard;
  CHECK(standard.day_number({1582, 10, 15}) - standard.day_number({1582, 10, 4}) == 1);
  for (int day = 5; day <= 14; ++day) CHECK_FALSE(standard.valid({1582, 10, day}));
  CHECK(standard.valid({1582, 10, 4}));
  CHECK(standard.valid({1582, 10, 15}));
  CHECK(standard.days_in_year(1582) == 355);
  CHECK(standard.days_in_month(1582, 10) == 21);
  CHECK(standard.valid({1500, 2, 29}));
  CHECK_FALSE(standard.valid({1900, 2, 29}));
  CHECK(Calendar::from_cf("proleptic_gregorian", "").valid({1582, 10, 10}));
}

TEST_CASE("1917-11-07 standard is 1917-10-25 julian (CF 1.13, section 4.4)") {
  const Calendar standard, julian = Calendar::from_cf("julian", "");
  CHECK(standard.day_number({1917, 11, 7}) == julian.day_number({1917, 10, 25}));
}

TEST_CASE("a century has the length its calendar says") {
  // Counted by hand: 1850 to 1950 has 24 Gregorian leap days (1900 is none).
  const auto century = [](const char* name) {
    const Calendar calendar = Calendar::from_cf(name, "");
    return calendar.day_number({1950, 1, 1}) - calendar.day_number({1850, 1, 1});
  };
  CHECK(century("360_day") == 36000);
  CHECK(century("noleap") == 36500);
  CHECK(century("all_leap") == 36600);
  CHECK(century("proleptic_gregorian") == 36524);
  CHECK(century("standard") == 36524);
  CHECK(century("julian") == 36525);
}

TEST_CASE("a custom calendar has its leap day every fourth year in its leap month") {
  const Calendar calendar = Calendar::custom({30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30}, 1999, 6);
  for (int year = -9; year < 20; ++year) {
    const bool leap = ((year - 1999) % 4 + 4) % 4 == 0;
    CHECK(calendar.days_in_year(year) == (leap ? 361 : 360));
    CHECK(calendar.valid({year, 6, 31}) == leap);
  }
  CHECK(calendar.cf_name().empty());
  CHECK_THROWS_AS(Calendar::custom({0, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30}, 0, 2), Error);
  CHECK_THROWS_AS(Calendar::custom({30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30}, 4, 13), Error);
}

TEST_CASE("calendar names of CF are known in any case, and written without aliases") {
  CHECK(Calendar::from_cf("", "f").cf_name() == "standard");
  CHECK(Calendar::from_cf("Gregorian", "f").cf_name() == "standard");
  CHECK(Calendar::from_cf("365_day", "f") == Calendar::from_cf("NOLEAP", "f"));
  CHECK(Calendar::from_cf("366_day", "f").cf_name() == "all_leap");
  CHECK(message([] { Calendar::from_cf("none", "a.nc: time"); }) ==
        "a.nc: time: calendar 'none' cannot be used; expected standard, proleptic_gregorian, julian, noleap (365_day), "
        "all_leap (366_day), 360_day, utc or tai");
}

TEST_CASE("the year fraction of a day is its middle") {
  const Calendar noleap = Calendar::from_cf("noleap", ""), standard;
  CHECK(noleap.year_fraction({2001, 7, 2}) == 0.5);
  CHECK(standard.year_fraction({2000, 2, 29}) == 59.5 / 366);
  CHECK(Calendar::from_cf("360_day", "").year_fraction({1, 1, 1}) == 0.5 / 360);
}

TEST_CASE("an instant belongs to the day that it is in, before year zero too") {
  const Calendar calendar;
  CHECK(calendar.date_of(-1) == Date{-1, 12, 31});
  CHECK(calendar.date_of(0) == Date{0, 1, 1});
  CHECK(calendar.date_of(calendar.instant({1981, 1, 31}) + kDay - 1) == Date{1981, 1, 31});
}

TEST_CASE("dates are read strictly and written as ISO 8601") {
  CHECK(parse_date("1981-1-31", "") == Date{1981, 1, 31});
  CHECK(parse_date(" 0850-02-30 ", "") == Date{850, 2, 30});
  CHECK(to_string({-1, 1, 31}) == "-0001-01-31");
  CHECK(to_string({850, 1, 31}) == "0850-01-31");
  for (const char* text : {"", "1981", "1981-01", "1981-13-01", "1981-00-01", "1981-01-32", "1981-01-0", "1981/01/01",
                           "1981-01-01T00", "19810101", "1981-01-01x", "9999999-01-01"}) {
    CHECK_THROWS_AS(parse_date(text, ""), Error);
  }
  CHECK(message([] { parse_date("31.1.1981", "s.csv:4"); }) ==
        "s.csv:4: '31.1.1981' is not a date; expected YYYY-MM-DD");
}
