// The leap seconds of UTC and what they do to counts of seconds. Used by time units in the `utc` calendar only.
#pragma once
#include "windrow/calendar/calendar.h"

namespace windrow::calendar {

/// Elapsed microseconds of an instant of the utc calendar, leap seconds counted: instant + 1 s for each one before it.
Instant utc_elapsed(Instant instant);
/// The inverse; within a leap second the last microsecond of the day.
Instant utc_instant(Instant elapsed);

/// 1972-01-01, from which on UTC differs from TAI by whole seconds; before, days are counted as 86 400 s here.
inline constexpr Date kUtcStart{1972, 1, 1};

}  // namespace windrow::calendar
