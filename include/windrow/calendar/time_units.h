// CF/UDUNITS time units: "days since 1850-01-01 00:00:00", with every spelling section 4.4 allows.
#pragma once
#include <string>

#include "windrow/calendar/calendar.h"

namespace windrow::calendar {

/// Units of one time axis in one calendar. Counting is exact: values are rounded to the microsecond.
class TimeUnits {
 public:
  /// Accepts s/sec/second(s), min, h/hr/hour(s), d/day(s), week(s), ms/us; since|after|from|ref and `@` as UDUNITS does;
  /// dates unpadded, separated by blank or T; Z, UTC, +hh, +hh:mm, -hmm offsets (not in utc/tai). `month(s)` and
  /// `year(s)` since: UDUNITS lengths are fractional days and never what was meant: whole months or years from a
  /// reference on a month's first day are read as calendar months and reported through `odd`; otherwise Error(data).
  static TimeUnits parse(const std::string& units, const Calendar& calendar, const std::string& place,
                         std::string* odd = nullptr);
  [[nodiscard]] Instant decode(double value) const;
  [[nodiscard]] double encode(Instant instant) const;
  [[nodiscard]] const Calendar& calendar() const { return calendar_; }

 private:
  Calendar calendar_;
  Instant reference_ = 0;       // UTC of the reference
  std::int64_t unit_us_ = kDay;  // microseconds a unit; 0: calendar months
  int months_per_unit_ = 0;
};

}  // namespace windrow::calendar
