// Table of leap seconds. Source: IERS Bulletin C (list of TAI-UTC changes), written down from memory; the reference
// test compares it with the copy of the IERS list in the system's time zone data where that is installed.
#include "leap_seconds.h"

#include <array>

namespace windrow::calendar {
namespace {

constexpr Instant kSecond = 1'000'000;

// A leap second follows 23:59:59 of each of these days; CF 1.13 Appendix M counts 27 of them.
constexpr std::array<Date, 27> kLeapDays = {{
    {1972, 6, 30},  {1972, 12, 31}, {1973, 12, 31}, {1974, 12, 31}, {1975, 12, 31}, {1976, 12, 31}, {1977, 12, 31},
    {1978, 12, 31}, {1979, 12, 31}, {1981, 6, 30},  {1982, 6, 30},  {1983, 6, 30},  {1985, 6, 30},  {1987, 12, 31},
    {1989, 12, 31}, {1990, 12, 31}, {1992, 6, 30},  {1993, 6, 30},  {1994, 6, 30},  {1995, 12, 31}, {1997, 6, 30},
    {1998, 12, 31}, {2005, 12, 31}, {2008, 12, 31}, {2012, 6, 30},  {2015, 6, 30},  {2016, 12, 31},
}};

/// The instants at which the days with a leap second end, ascending.
const std::array<Instant, 27>& day_ends() {
  static const std::array<Instant, 27> ends = [] {
    const Calendar utc = Calendar::from_cf("utc", "");
    std::array<Instant, 27> result{};
    for (std::size_t i = 0; i < kLeapDays.size(); ++i) result[i] = utc.instant(kLeapDays[i]) + kDay;
    return result;
  }();
  return ends;
}

}  // namespace

Instant utc_elapsed(Instant instant) {
  Instant leaps = 0;
  for (const Instant end : day_ends()) leaps += instant >= end;
  return instant + leaps * kSecond;
}

Instant utc_instant(Instant elapsed) {
  Instant leaps = 0;
  for (const Instant end : day_ends()) {
    const Instant leap_starts = end + leaps * kSecond;
    if (elapsed < leap_starts) break;
    if (elapsed < leap_starts + kSecond) return end - 1;
    ++leaps;
  }
  return elapsed - leaps * kSecond;
}

}  // namespace windrow::calendar
