// Calendars and dates in whole numbers: month lengths, day numbers and back. Time units are in time_units.cpp.
#include "windrow/calendar/calendar.h"

#include <fmt/format.h>

#include <numeric>

#include "integer.h"
#include "scanner.h"
#include "windrow/base/error.h"

namespace windrow::calendar {
namespace {

using Kind = Calendar::Kind;
constexpr std::array<int, 12> kCommonMonths = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};

struct Name {
  const char* name;
  Kind kind;
};
// The first name of a kind is the one written.
constexpr Name kNames[] = {{"standard", Kind::standard},
                           {"gregorian", Kind::standard},
                           {"proleptic_gregorian", Kind::proleptic_gregorian},
                           {"julian", Kind::julian},
                           {"noleap", Kind::noleap},
                           {"365_day", Kind::noleap},
                           {"all_leap", Kind::all_leap},
                           {"366_day", Kind::all_leap},
                           {"360_day", Kind::day360},
                           {"utc", Kind::utc},
                           {"tai", Kind::tai}};

// The change from Julian to Gregorian dates: 1582-10-04 is followed by 1582-10-15.
constexpr int kChangeYear = 1582, kChangeMonth = 10, kLastJulianDay = 4, kFirstGregorianDay = 15;
constexpr int kDaysSkipped = kFirstGregorianDay - kLastJulianDay - 1;

bool julian_leap(int year) { return floor_mod(year, 4) == 0; }
bool gregorian_leap(int year) {
  return floor_mod(year, 4) == 0 && (floor_mod(year, 100) != 0 || floor_mod(year, 400) == 0);
}
/// Leap years in [0, year), negative for the years [year, 0).
std::int64_t julian_leaps_before(std::int64_t year) { return floor_div(year + 3, 4); }
std::int64_t gregorian_leaps_before(std::int64_t year) {
  return floor_div(year + 3, 4) - floor_div(year + 99, 100) + floor_div(year + 399, 400);
}
std::int64_t julian_year_start(std::int64_t year) { return 365 * year + julian_leaps_before(year); }
std::int64_t gregorian_year_start(std::int64_t year) { return 365 * year + gregorian_leaps_before(year); }

}  // namespace

std::string to_string(Date date) {
  return date.year < 0 ? fmt::format("-{:04}-{:02}-{:02}", -std::int64_t{date.year}, date.month, date.day)
                       : fmt::format("{:04}-{:02}-{:02}", date.year, date.month, date.day);
}

Date parse_date(const std::string& text, const std::string& place) {
  Scanner scanner(text);
  scanner.skip_blanks();
  const auto date = scanner.date();
  scanner.skip_blanks();
  if (!date || !scanner.at_end() || date->day > 31) {
    throw Error(Failure::data, place, fmt::format("'{}' is not a date; expected YYYY-MM-DD", shortened(text)));
  }
  return *date;
}

Calendar Calendar::from_cf(const std::string& name, const std::string& place) {
  Calendar calendar;
  const std::string word = lower_case(name);
  if (word.empty()) return calendar;
  for (const Name& entry : kNames) {
    if (word == entry.name) {
      calendar.kind_ = entry.kind;
      return calendar;
    }
  }
  throw Error(
      Failure::data, place,
      fmt::format("calendar '{}' cannot be used; expected standard, proleptic_gregorian, julian, noleap (365_day), "
                  "all_leap (366_day), 360_day, utc or tai",
                  shortened(name)));
}

Calendar Calendar::custom(const std::array<int, 12>& month_lengths, int leap_year, int leap_month) {
  for (const int length : month_lengths) {
    if (length < 1 || length > 1000) {
      throw Error(Failure::data, "month_lengths", fmt::format("{} days in a month; expected 1 to 1000", length));
    }
  }
  if (leap_month < 1 || leap_month > 12) {
    throw Error(Failure::data, "leap_month", fmt::format("{} is no month; expected 1 to 12", leap_month));
  }
  Calendar calendar;
  calendar.kind_ = Kind::custom;
  calendar.month_lengths_ = month_lengths;
  calendar.leap_year_ = leap_year;
  calendar.leap_month_ = leap_month;
  return calendar;
}

std::string Calendar::cf_name() const {
  for (const Name& entry : kNames) {
    if (entry.kind == kind_) return entry.name;
  }
  return {};
}

bool Calendar::is_leap(int year) const {
  switch (kind_) {
    case Kind::standard:
      return year <= kChangeYear ? julian_leap(year) : gregorian_leap(year);
    case Kind::julian:
      return julian_leap(year);
    case Kind::noleap:
    case Kind::day360:
      return false;
    case Kind::all_leap:
      return true;
    case Kind::custom:
      return leap_year_ != 0 && floor_mod(std::int64_t{year} - leap_year_, 4) == 0;
    case Kind::proleptic_gregorian:
    case Kind::utc:
    case Kind::tai:
      return gregorian_leap(year);
  }
  throw Error(Failure::defect, "calendar", "unknown kind");
}

/// Length by the month's last day number: 31 for October 1582 in standard as well.
int Calendar::nominal_month_length(int year, int month) const {
  if (kind_ == Kind::day360) return 30;
  if (kind_ == Kind::custom) {
    return month_lengths_[static_cast<std::size_t>(month - 1)] + (month == leap_month_ && is_leap(year) ? 1 : 0);
  }
  return kCommonMonths[static_cast<std::size_t>(month - 1)] + (month == 2 && is_leap(year) ? 1 : 0);
}

int Calendar::days_in_month(int year, int month) const {
  const bool change = kind_ == Kind::standard && year == kChangeYear && month == kChangeMonth;
  return nominal_month_length(year, month) - (change ? kDaysSkipped : 0);
}

int Calendar::days_in_year(int year) const { return static_cast<int>(year_start(year + 1) - year_start(year)); }

bool Calendar::valid(Date date) const {
  if (date.month < 1 || date.month > 12 || date.day < 1) return false;
  if (date.day > nominal_month_length(date.year, date.month)) return false;
  const bool change = kind_ == Kind::standard && date.year == kChangeYear && date.month == kChangeMonth;
  return !(change && date.day > kLastJulianDay && date.day < kFirstGregorianDay);
}

std::int64_t Calendar::year_start(int year) const {
  const std::int64_t y = year;
  switch (kind_) {
    case Kind::standard:
      // Gregorian years are tied to the Julian count by their common day 1582-10-15 = Julian 1582-10-05.
      return y <= kChangeYear ? julian_year_start(y)
                              : gregorian_year_start(y) +
                                    (julian_year_start(kChangeYear) - gregorian_year_start(kChangeYear) - kDaysSkipped);
    case Kind::julian:
      return julian_year_start(y);
    case Kind::noleap:
      return 365 * y;
    case Kind::day360:
      return 360 * y;
    case Kind::all_leap:
      return 366 * y;
    case Kind::custom: {
      const std::int64_t common = std::accumulate(month_lengths_.begin(), month_lengths_.end(), std::int64_t{0});
      if (leap_year_ == 0) return common * y;
      // Leap years in [0, y) are those congruent to leap_year_ modulo 4.
      const std::int64_t phase = floor_mod(leap_year_, 4);
      return common * y + floor_div(y + 3 - phase, 4) - floor_div(3 - phase, 4);
    }
    case Kind::proleptic_gregorian:
    case Kind::utc:
    case Kind::tai:
      return gregorian_year_start(y);
  }
  throw Error(Failure::defect, "calendar", "unknown kind");
}

int Calendar::day_of_year(Date date) const {
  int day = date.day;
  for (int month = 1; month < date.month; ++month) day += days_in_month(date.year, month);
  const bool after_change = kind_ == Kind::standard && date.year == kChangeYear && date.month == kChangeMonth &&
                            date.day >= kFirstGregorianDay;
  return after_change ? day - kDaysSkipped : day;
}

double Calendar::year_fraction(Date date) const { return (day_of_year(date) - 0.5) / days_in_year(date.year); }

std::int64_t Calendar::day_number(Date date) const { return year_start(date.year) + day_of_year(date) - 1; }

Date Calendar::date(std::int64_t day_number) const {
  // Exact to a year where every fourth year is leap; Gregorian centuries add less than a year per 40 000.
  int year = static_cast<int>(floor_div(4 * day_number, year_start(4) - year_start(0)));
  while (year_start(year) > day_number) --year;
  while (year_start(year + 1) <= day_number) ++year;
  Date result{year, 1, 1};
  std::int64_t rest = day_number - year_start(year);
  while (rest >= days_in_month(year, result.month)) rest -= days_in_month(year, result.month++);
  result.day = static_cast<int>(rest) + 1;
  const bool change = kind_ == Kind::standard && year == kChangeYear && result.month == kChangeMonth;
  if (change && result.day > kLastJulianDay) result.day += kDaysSkipped;
  return result;
}

Date Calendar::date_of(Instant instant) const { return date(floor_div(instant, kDay)); }

}  // namespace windrow::calendar
