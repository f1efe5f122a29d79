// Laws of time units: spellings, exact counting, leap seconds, refusals.
#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <random>

#include "windrow/base/error.h"
#include "windrow/calendar/time_units.h"

using namespace windrow;
using namespace windrow::calendar;

namespace {

constexpr Instant kSecond = 1'000'000, kHour = 3600 * kSecond;

Instant reference(const std::string& units, const char* calendar = "standard") {
  return TimeUnits::parse(units, Calendar::from_cf(calendar, ""), "test").decode(0);
}

std::string refusal(const std::string& units, const char* calendar = "standard") {
  try {
    TimeUnits::parse(units, Calendar::from_cf(calendar, ""), "a.nc: time");
  } catch (const Error& error) {
    CHECK(error.kind() == Failure::data);
    return error.what();
  }
  return "accepted";
}

double seconds_of_utc(const char* calendar, Date date, Instant clock) {
  const TimeUnits units = TimeUnits::parse("seconds since 2016-12-31 23:59:58", Calendar::from_cf(calendar, ""), "");
  return units.encode(units.calendar().instant(date) + clock);
}

}  // namespace

TEST_CASE("every spelling of a reference means the same instant") {
  const Instant day = Calendar().instant({1900, 1, 1});
  for (const char* text : {"days since 1900-01-01",
                           "day since 1900-1-1",
                           "d since 1900-01-01 0",
                           "Days Since 1900-01-01 00:00",
                           "hours since 1900-01-01 00:00:00.0",
                           "Hour since 1900-1-1 0:0:0",
                           "hrs since 1900-01-01T00:00:00Z",
                           "h since 1900-01-01T00:00:00",
                           "seconds since 1900-01-01 00:00:00 UTC",
                           "s @ 1900-01-01",
                           "sec @1900-01-01",
                           "minutes after 1900-01-01 00:00:00 +00:00",
                           "min from 1900-01-01 00:00:0.0 0:00",
                           "ms ref 1900-01-01 0000",
                           "microseconds since 1900-01-01 01:00 +1",
                           "weeks since 1900-01-01 01:30 +01:30",
                           "days since 1899-12-31 18:00:00 -6:00",
                           "days since 1899-12-31 18:00:00 -600",
                           "days since 1900-01-01 05:30:00.000000 +0530",
                           "  days   since  1900-01-01  00:00:00  GMT "}) {
    CAPTURE(text);
    CHECK(reference(text) == day);
  }
  CHECK(reference("seconds since 1992-10-8 15:15:42.5 -6:00") ==
        Calendar().instant({1992, 10, 8}) + 21 * kHour + 942 * kSecond + kSecond / 2);
  CHECK(reference("days since 1-1-1") == 366 * kDay);
}

TEST_CASE("what cannot be a time unit is refused in one clear line") {
  CHECK(refusal("K") ==
        "a.nc: time: time units 'K' do not begin with a unit of time; expected e.g. 'days since 1850-01-01'");
  CHECK(refusal("day as %Y%m%d.%f") ==
        "a.nc: time: time units 'day as %Y%m%d.%f' have no reference date; expected e.g. 'days since 1850-01-01'");
  CHECK(refusal("days since 1850") ==
        "a.nc: time: time units 'days since 1850' have a reference that cannot be read; expected e.g. 1850-01-01 "
        "00:00:00 or 1850-1-1T06:00Z");
  CHECK(
      refusal("days since 1582-10-10") ==
      "a.nc: time: time units 'days since 1582-10-10' refer to 1582-10-10, which the calendar standard does not have");
  CHECK(refusal("days since 2001-02-29", "noleap") ==
        "a.nc: time: time units 'days since 2001-02-29' refer to 2001-02-29, which the calendar noleap does not have");
  CHECK(refusal("seconds since 2000-01-01 00:00 +1", "utc") ==
        "a.nc: time: time units 'seconds since 2000-01-01 00:00 +1' have a time zone, which the calendar utc does not "
        "allow");
  for (const char* text :
       {"", "days", "days since", "dayssince 1850-01-01", "3 days since 1850-01-01", "days since 1850-13-01",
        "days since 1850-01-01 25:00", "days since 1850-01-01 00:60", "days since 1850-01-01 00:00:60",
        "days since 1850-01-01 -6:00", "days since 1850-01-01Z", "days since 1850-01-01 00:00 x",
        "days since 1850-01-01 00:00 +30", "days since 18500101", "days until 1850-01-01", "months since 1850-01-15",
        "days since 200001-01-01", "days since 1850-01-01 00:00:00 UTC+1"}) {
    CAPTURE(text);
    CHECK(refusal(text) != "accepted");
  }
}

TEST_CASE("whole counts are exact over the whole range, and decoding returns what was encoded") {
  std::mt19937_64 random(4404);
  for (const char* name : {"standard", "proleptic_gregorian", "julian", "noleap", "all_leap", "360_day", "tai"}) {
    const Calendar calendar = Calendar::from_cf(name, "");
    for (const char* text : {"days since 1850-1-1", "hours since 1-1-1", "seconds since 1970-1-1",
                             "minutes since 2000-1-1", "weeks since 1900-1-1", "ms since 1999-12-30 12:34:56.789"}) {
      const TimeUnits units = TimeUnits::parse(text, calendar, "");
      for (int i = 0; i < 2000; ++i) {
        const auto whole = static_cast<double>(static_cast<std::int64_t>(random() % 2'000'000) - 1'000'000);
        REQUIRE(units.encode(units.decode(whole)) == whole);
        const Instant instant = units.decode(0) + static_cast<Instant>(random() % (400 * kDay)) - 200 * kDay;
        REQUIRE(units.decode(units.encode(instant)) == instant);
      }
    }
  }
}

TEST_CASE("a value coarser than a microsecond decodes to the whole second it came from") {
  const TimeUnits units = TimeUnits::parse("days since 1-1-1", Calendar(), "");
  for (int hour = 0; hour < 24 * 400; ++hour) {
    const Instant instant = Calendar().instant({2000, 1, 1}) + hour * kHour;
    REQUIRE(units.decode(730121.0 + hour / 24.0) == units.decode(730121.0) + hour * kHour);
    REQUIRE(units.decode(units.encode(instant)) == instant);
  }
}

TEST_CASE("CF 1.13 section 4.4: a day after 2020-02-28 23:10") {
  const auto next = [](const char* name) {
    const TimeUnits units = TimeUnits::parse("days since 2020-02-28 23:10", Calendar::from_cf(name, ""), "");
    return units.calendar().date_of(units.decode(1));
  };
  CHECK(next("standard") == Date{2020, 2, 29});
  CHECK(next("noleap") == Date{2020, 3, 1});
  CHECK(next("360_day") == Date{2020, 2, 29});
}

TEST_CASE("CF 1.13 examples 7.9 and 7.10: encoded seasons and decades") {
  const TimeUnits a = TimeUnits::parse("days since 1960-1-1", Calendar(), "");
  const auto days = [](const TimeUnits& units, Date date) { return units.encode(Calendar().instant(date)); };
  CHECK(days(a, {1960, 4, 16}) == 106);
  CHECK(days(a, {1960, 7, 16}) == 197);
  CHECK(days(a, {1960, 10, 16}) == 289);
  CHECK(days(a, {1961, 1, 16}) == 381);
  CHECK(days(a, {1960, 3, 1}) == 60);
  CHECK(days(a, {1990, 6, 1}) == 11109);
  CHECK(days(a, {1960, 12, 1}) == 335);
  CHECK(days(a, {1991, 3, 1}) == 11382);
  const TimeUnits b = TimeUnits::parse("days since 1901-1-1", Calendar(), "");
  CHECK(days(b, {1965, 1, 15}) == 23390);
  CHECK(days(b, {1961, 1, 1}) == 21915);
  CHECK(days(b, {1990, 2, 1}) == 32538);
}

TEST_CASE("CF 1.13 Appendix M: utc counts leap seconds, standard and tai do not") {
  CHECK(seconds_of_utc("utc", {2017, 1, 1}, kSecond) == 4);
  CHECK(seconds_of_utc("standard", {2017, 1, 1}, kSecond) == 3);
  CHECK(seconds_of_utc("tai", {2017, 1, 1}, kSecond) == 3);
  CHECK(seconds_of_utc("utc", {2017, 1, 2}, kSecond) - seconds_of_utc("utc", {2017, 1, 1}, 0) == 86401);
  CHECK(seconds_of_utc("utc", {2017, 1, 1}, 0) - seconds_of_utc("utc", {2016, 12, 31}, 0) == 86401);
  CHECK(seconds_of_utc("standard", {2017, 1, 1}, 0) - seconds_of_utc("standard", {2016, 12, 31}, 0) == 86400);
  const Calendar utc = Calendar::from_cf("utc", "");
  const TimeUnits units = TimeUnits::parse("seconds since 1972-01-01", utc, "");
  const Instant now = utc.instant({2024, 1, 1});
  CHECK(units.encode(now) == static_cast<double>((now - utc.instant({1972, 1, 1})) / kSecond + 27));
  const TimeUnits leap = TimeUnits::parse("seconds since 2016-12-31 23:59:58", utc, "");
  CHECK(leap.decode(1) == utc.instant({2017, 1, 1}) - kSecond);
  CHECK(leap.decode(2) == utc.instant({2017, 1, 1}) - 1);  // 23:59:60, folded
  CHECK(leap.decode(3) == utc.instant({2017, 1, 1}));
  std::string odd;
  TimeUnits::parse("seconds since 1970-01-01", utc, "", &odd);
  CHECK(odd == "time units 'seconds since 1970-01-01' refer to a date before 1972, where days of 86400 s are counted");
}

TEST_CASE("every day outside a leap second decodes to what was encoded in utc") {
  const Calendar utc = Calendar::from_cf("utc", "");
  const TimeUnits units = TimeUnits::parse("seconds since 1990-06-15 12:00", utc, "");
  Instant last = 0;
  for (std::int64_t day = utc.day_number({1970, 1, 1}); day < utc.day_number({2025, 1, 1}); ++day) {
    for (const Instant clock : {Instant{0}, kHour, kDay - kSecond}) {
      const Instant instant = day * kDay + clock;
      REQUIRE(units.decode(units.encode(instant)) == instant);
      REQUIRE(instant > last);
      last = instant;
    }
  }
}

TEST_CASE("months and years are calendar months, whole, and told") {
  std::string odd;
  const TimeUnits months = TimeUnits::parse("months since 1850-01-01", Calendar(), "a.nc: time", &odd);
  CHECK(odd == "time units 'months since 1850-01-01' are read as calendar months");
  CHECK(months.calendar().date_of(months.decode(13)) == Date{1851, 2, 1});
  CHECK(months.calendar().date_of(months.decode(-1)) == Date{1849, 12, 1});
  for (int month = -5000; month < 5000; ++month) REQUIRE(months.encode(months.decode(month)) == month);
  const TimeUnits years = TimeUnits::parse("years since 1850-07-01", Calendar(), "");
  CHECK(years.calendar().date_of(years.decode(150)) == Date{2000, 7, 1});
  try {
    (void)months.decode(0.5);
    FAIL("half a month was decoded");
  } catch (const Error& error) {
    CHECK(std::string(error.what()) ==
          "a.nc: time: time 0.5 in 'months since 1850-01-01' is no whole number of months; expected days since");
  }
  CHECK_THROWS_AS((void)months.encode(Calendar().instant({1850, 1, 2})), Error);
  CHECK_THROWS_AS((void)years.encode(Calendar().instant({1850, 8, 1})), Error);
}

TEST_CASE("year zero and before are read as years before year 1, and told") {
  std::string odd;
  const TimeUnits units = TimeUnits::parse("days since 0-1-1", Calendar(), "", &odd);
  CHECK(odd == "time units 'days since 0-1-1' refer to year 0, read as the year 1 before year 1");
  CHECK(units.decode(0) == 0);
  odd.clear();
  TimeUnits::parse("days since 1850-1-1", Calendar(), "", &odd);
  CHECK(odd.empty());
}

TEST_CASE("values that are no time are refused") {
  const TimeUnits days = TimeUnits::parse("days since 1850-1-1", Calendar(), "a.nc: time");
  const TimeUnits months = TimeUnits::parse("months since 1850-1-1", Calendar(), "a.nc: time");
  for (const double value : {std::nan(""), std::numeric_limits<double>::infinity(), 1e300, -1e300, 9.96921e36, 1e9}) {
    CHECK_THROWS_AS((void)days.decode(value), Error);
    CHECK_THROWS_AS((void)months.decode(value), Error);
  }
}

TEST_CASE("no text crashes the reading of time units: it is read or refused") {
  std::mt19937_64 random(197);
  const std::string pieces[] = {
      "days",       "months", " since ",    "@",     "1850", "-",          "01",
      ":",          "00",     " ",          "T",     "Z",    "+",          ".",
      "9999999",    "s",      "UTC",        "0",     "-1",   "1",          "\n",
      "\xff",       "",       "1582-10-10", "since", "year", "2000-01-01", std::string(1, '\0'),
      "4294967297", "e9"};
  const char* calendars[] = {"standard", "360_day", "utc", "julian"};
  int read = 0;
  for (int i = 0; i < 200'000; ++i) {
    std::string text = i % 3 == 0 ? "days since 2000-01-01 " : "";
    for (auto n = random() % 8; n > 0; --n) text += pieces[random() % std::size(pieces)];
    if (i % 5 == 0 && !text.empty()) text[random() % text.size()] = static_cast<char>(random() % 256);
    try {
      std::string odd;
      const TimeUnits units = TimeUnits::parse(text, Calendar::from_cf(calendars[random() % 4], ""), "fuzz", &odd);
      (void)units.encode(units.decode(1));
      ++read;
    } catch (const Error& error) {
      REQUIRE(error.kind() == Failure::data);
    }
  }
  CHECK(read > 1000);  // or the test would try refusals only
}
