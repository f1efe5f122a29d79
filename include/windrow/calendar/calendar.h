// CF calendars and dates as integers. No floating point except in encode/decode of time units (time_units.h).
// Source: CF Conventions 1.13, section 4.4.
// Years are astronomical in every calendar: year 0 is the year before year 1 and is leap where the rule says so.
// `standard` is Julian to 1582-10-04 and Gregorian from 1582-10-15; `utc` and `tai` have proleptic Gregorian dates.
#pragma once
#include <array>
#include <compare>
#include <cstdint>
#include <string>
#include <vector>

namespace windrow::calendar {

struct Date {
  int year = 1, month = 1, day = 1;
  auto operator<=>(const Date&) const = default;
};
std::string to_string(Date date);  ///< ISO 8601, e.g. 1981-01-31; a negative year as -0001-01-31
/// Error(data) unless YYYY-MM-DD (unpadded and signed years accepted) with month 1..12 and day 1..31; whether a
/// calendar has the day is for Calendar::valid to say.
Date parse_date(const std::string& text, const std::string& place);

/// Years a date may have wherever text is read: differences of two such Instants still fit.
inline constexpr int kMaxYear = 100'000;

/// Microseconds since 0000-01-01 00:00 of the calendar at hand (year 0 exists in every calendar here). Every day counts
/// 86 400 s, in `utc` as well: a leap second is folded into the last microsecond of its day (time_units.h).
using Instant = std::int64_t;
inline constexpr Instant kDay = 86'400'000'000;

class Calendar {
 public:
  enum class Kind { standard, proleptic_gregorian, julian, noleap, all_leap, day360, utc, tai, custom };
  Calendar() = default;  ///< standard
  /// `name` as in the CF attribute (gregorian, 365_day, ... accepted, case-insensitive); empty: standard.
  /// Error(data) with the valid names for anything unknown and for `none`.
  static Calendar from_cf(const std::string& name, const std::string& place);
  /// User-defined calendar: month_lengths (12), leap_year (0: none; else every fourth year from it, both ways, is
  /// leap), leap_month (default 2; a day longer in leap years). CF 4.4.3. Error(data) for a length outside 1..1000.
  static Calendar custom(const std::array<int, 12>& month_lengths, int leap_year, int leap_month);

  [[nodiscard]] Kind kind() const { return kind_; }
  /// The CF attribute, never a deprecated alias; empty for custom (CF: month_lengths stands in its place).
  [[nodiscard]] std::string cf_name() const;
  [[nodiscard]] const std::array<int, 12>& month_lengths() const { return month_lengths_; }  ///< custom only
  [[nodiscard]] int leap_year() const { return leap_year_; }                                 ///< custom only
  [[nodiscard]] int leap_month() const { return leap_month_; }                               ///< custom only
  [[nodiscard]] bool is_leap(int year) const;  ///< true where the year has its longer form; never in noleap or 360_day
  [[nodiscard]] int days_in_month(int year, int month) const;  ///< 21 for 1582-10 in standard
  [[nodiscard]] int days_in_year(int year) const;              ///< 355 for 1582 in standard
  [[nodiscard]] bool valid(Date date) const;                   ///< false e.g. for 1582-10-05..14 in standard
  [[nodiscard]] std::int64_t day_number(Date date) const;      ///< days since 0000-01-01; date must be valid
  [[nodiscard]] Date date(std::int64_t day_number) const;
  [[nodiscard]] int day_of_year(Date date) const;  ///< 1..days_in_year
  /// Position of the date's middle in its year, 0..1: (day_of_year - 0.5) / days_in_year.
  [[nodiscard]] double year_fraction(Date date) const;
  [[nodiscard]] Instant instant(Date date) const { return day_number(date) * kDay; }
  [[nodiscard]] Date date_of(Instant instant) const;  ///< the day that holds the instant, also before year 0
  bool operator==(const Calendar&) const = default;

 private:
  [[nodiscard]] int nominal_month_length(int year, int month) const;
  [[nodiscard]] std::int64_t year_start(int year) const;

  Kind kind_ = Kind::standard;
  std::array<int, 12> month_lengths_{};
  int leap_year_ = 0, leap_month_ = 2;
};

}  // namespace windrow::calendar
