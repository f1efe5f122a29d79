// CF/UDUNITS time units: "days since 1850-01-01 00:00:00", with every spelling section 4.4 allows.
#pragma once
#include <string>

#include "windrow/calendar/calendar.h"

namespace windrow::calendar {

/// Units of one time axis in one calendar. Counting is exact: values are rounded to the microsecond. Where a
/// fraction is coarser than that (730000.1 days is known to 10 us), decode takes the whole second, else the whole
/// millisecond, within one unit in the value's last place, if there is one: 01:00:00 never becomes 00:59:59.999996.
/// In `utc` the 27 leap seconds of 1972-2016 count (days before 1972 count 86 400 s, told through `odd`); an instant in
/// a leap second decodes to the last microsecond of its day. `tai` has none.
class TimeUnits {
 public:
  /// Accepts s/sec/second(s), min, h/hr/hour(s), d/day(s), week(s), ms/us; since|after|from|ref and `@` as UDUNITS
  /// does; dates unpadded, separated by blank or T; Z, UTC, +hh, +hh:mm, -hmm offsets (not in utc/tai). `month(s)` and
  /// `year(s)` since: UDUNITS lengths are fractional days and never what was meant: whole months or years from a
  /// reference on a month's first day are read as calendar months and reported through `odd`; otherwise Error(data).
  static TimeUnits parse(const std::string& units, const Calendar& calendar, const std::string& place,
                         std::string* odd = nullptr);
  /// Error(data) when the value is not finite, beyond kMaxYear, or not whole where the units are months or years.
  [[nodiscard]] Instant decode(double value) const;
  /// The nearest double. Error(data) where the units are months or years and the instant is no whole number of them.
  [[nodiscard]] double encode(Instant instant) const;
  [[nodiscard]] const Calendar& calendar() const { return calendar_; }

 private:
  Calendar calendar_;
  Instant reference_ = 0;        // UTC of the reference
  std::int64_t unit_us_ = kDay;  // microseconds a unit; 0: calendar months
  int months_per_unit_ = 0;
  std::string place_, text_;  // for messages
};

}  // namespace windrow::calendar
