// CF calendars and dates as integers. No floating point except in encode/decode of time units (time_units.h).
// Source: CF Conventions 1.13, section 4.4.
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
std::string to_string(Date date);                       ///< ISO 8601, e.g. 1981-01-31
Date parse_date(const std::string& text, const std::string& place);  ///< Error(data) unless YYYY-MM-DD (unpadded accepted)

/// Microseconds since 0000-01-01 00:00 of the calendar at hand (year 0 exists in every calendar here).
using Instant = std::int64_t;
inline constexpr Instant kDay = 86'400'000'000;

class Calendar {
 public:
  enum class Kind { standard, proleptic_gregorian, julian, noleap, all_leap, day360, utc, tai, custom };
  Calendar() = default;  ///< standard
  /// `name` as in the CF attribute (gregorian, 365_day, ... accepted, case-insensitive); empty: standard.
  /// Error(data) with the valid names for anything unknown and for `none`.
  static Calendar from_cf(const std::string& name, const std::string& place);
  /// User-defined calendar: month_lengths (12), leap_year (0: none), leap_month (default 2). CF 4.4.3.
  static Calendar custom(const std::array<int, 12>& month_lengths, int leap_year, int leap_month);

  [[nodiscard]] Kind kind() const { return kind_; }
  [[nodiscard]] std::string cf_name() const;
  [[nodiscard]] int days_in_month(int year, int month) const;
  [[nodiscard]] int days_in_year(int year) const;
  [[nodiscard]] bool valid(Date date) const;             ///< false e.g. for 1582-10-05..14 in standard
  [[nodiscard]] std::int64_t day_number(Date date) const;  ///< days since 0000-01-01; date must be valid
  [[nodiscard]] Date date(std::int64_t day_number) const;
  [[nodiscard]] int day_of_year(Date date) const;        ///< 1..days_in_year
  /// Position of the date's middle in its year, 0..1: (day_of_year - 0.5) / days_in_year.
  [[nodiscard]] double year_fraction(Date date) const;
  [[nodiscard]] Instant instant(Date date) const { return day_number(date) * kDay; }
  [[nodiscard]] Date date_of(Instant instant) const;
  bool operator==(const Calendar&) const = default;

 private:
  Kind kind_ = Kind::standard;
  std::array<int, 12> month_lengths_{};
  int leap_year_ = 0, leap_month_ = 2;
};

}  // namespace windrow::calendar
