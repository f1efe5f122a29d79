// Time units: reading the attribute, and exact counting from value to instant and back.
#include "windrow/calendar/time_units.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>

#include "integer.h"
#include "leap_seconds.h"
#include "scanner.h"
#include "windrow/base/error.h"

namespace windrow::calendar {
namespace {

constexpr std::int64_t kMillisecond = 1000, kSecond = 1'000'000, kMinute = 60 * kSecond, kHour = 60 * kMinute;
constexpr std::int64_t kMaxDays = std::int64_t{366} * kMaxYear;
constexpr double kMaxInstant = static_cast<double>(kMaxDays * kDay);

struct UnitName {
  const char* name;
  std::int64_t microseconds;  // 0 for calendar months
  int months;
};
// Names of units of time in UDUNITS-2; its month and year (fractional days) are replaced by calendar months.
constexpr UnitName kUnitNames[] = {{"us", 1, 0},
                                   {"usec", 1, 0},
                                   {"microsecond", 1, 0},
                                   {"ms", kMillisecond, 0},
                                   {"msec", kMillisecond, 0},
                                   {"millisecond", kMillisecond, 0},
                                   {"s", kSecond, 0},
                                   {"sec", kSecond, 0},
                                   {"second", kSecond, 0},
                                   {"min", kMinute, 0},
                                   {"minute", kMinute, 0},
                                   {"h", kHour, 0},
                                   {"hr", kHour, 0},
                                   {"hour", kHour, 0},
                                   {"d", kDay, 0},
                                   {"day", kDay, 0},
                                   {"week", 7 * kDay, 0},
                                   {"month", 0, 1},
                                   {"year", 0, 12},
                                   {"yr", 0, 12}};

const UnitName* find_unit(const std::string& word) {
  for (const UnitName& unit : kUnitNames) {
    const std::string name = unit.name;
    if (word == name || (name.size() > 1 && word == name + "s")) return &unit;
  }
  return nullptr;
}

/// Microseconds of `.digits`, rounded; nullopt when no digit follows the point.
std::optional<std::int64_t> fraction(Scanner& scanner) {
  const auto run = scanner.digits();
  if (!run) return std::nullopt;
  std::int64_t value = 0, scale = kSecond;
  for (std::size_t i = 0; i < std::min<std::size_t>(run->size(), 6); ++i) {
    scale /= 10;
    value += ((*run)[i] - '0') * scale;
  }
  return value + (run->size() > 6 && (*run)[6] >= '5' ? 1 : 0);
}

/// h, hh, hhmm, hhmmss, h:m, h:m:s, h:m:s.f as microseconds of the day.
std::optional<std::int64_t> clock(Scanner& scanner) {
  const auto run = scanner.digits();
  if (!run || run->size() > 6 || run->size() == 3 || run->size() == 5) return std::nullopt;
  const auto pair = [&](std::size_t at) {
    return at + 2 <= run->size() ? ((*run)[at] - '0') * 10 + ((*run)[at + 1] - '0') : 0;
  };
  int hour = run->size() == 1 ? (*run)[0] - '0' : pair(0);
  int minute = pair(2), second = pair(4);
  std::int64_t rest = 0;
  if (run->size() <= 2 && scanner.accept(':')) {
    const auto m = scanner.number(2);
    if (!m) return std::nullopt;
    minute = *m;
    if (scanner.accept(':')) {
      const auto s = scanner.number(2);
      if (!s) return std::nullopt;
      second = *s;
      if (scanner.accept('.')) {
        // "00:00:0." is written by some programs; the bare point adds nothing.
        rest = fraction(scanner).value_or(0);
      }
    }
  }
  if (hour > 23 || minute > 59 || second > 59) return std::nullopt;
  return hour * kHour + minute * kMinute + second * kSecond + rest;
}

/// +hh, +hh:mm, -hmm, +hhmm (the sign may be missing) as microseconds east of Greenwich.
std::optional<std::int64_t> offset(Scanner& scanner) {
  const bool west = scanner.accept('-');
  if (!west) scanner.accept('+');
  const auto run = scanner.digits();
  if (!run || run->size() > 4) return std::nullopt;
  int number = 0;
  for (const char c : *run) number = number * 10 + (c - '0');
  int hour = number, minute = 0;
  if (run->size() > 2) {
    hour = number / 100;
    minute = number % 100;
  } else if (scanner.accept(':')) {
    const auto m = scanner.number(2);
    if (!m) return std::nullopt;
    minute = *m;
  }
  if (hour > 23 || minute > 59) return std::nullopt;
  const std::int64_t east = hour * kHour + minute * kMinute;
  return west ? -east : east;
}

/// What stands after "since".
struct Reference {
  Date date;
  std::int64_t clock = 0;
  std::int64_t offset = 0;
  bool has_offset = false;
};

std::optional<Reference> reference(Scanner& scanner) {
  Reference result;
  const auto date = scanner.date();
  if (!date) return std::nullopt;
  result.date = *date;
  const bool blank = scanner.peek() == ' ' || scanner.peek() == '\t';
  scanner.skip_blanks();
  if (scanner.at_end()) return result;
  const bool letter_t = scanner.accept('T') || scanner.accept('t');
  if (!blank && !letter_t) return std::nullopt;
  const auto time = clock(scanner);
  if (!time) return std::nullopt;
  result.clock = *time;
  scanner.skip_blanks();
  if (scanner.at_end()) return result;
  result.has_offset = true;
  const std::string zone = scanner.word();
  if (zone.empty()) {
    const auto east = offset(scanner);
    if (!east) return std::nullopt;
    result.offset = *east;
  } else if (zone != "z" && zone != "utc" && zone != "gmt") {
    return std::nullopt;
  }
  scanner.skip_blanks();
  if (!scanner.at_end()) return std::nullopt;
  return result;
}

bool accept_since(Scanner& scanner) {
  scanner.skip_blanks();
  if (scanner.accept('@')) {
    scanner.skip_blanks();
    return true;
  }
  const std::string word = scanner.word();
  const bool blank = scanner.peek() == ' ' || scanner.peek() == '\t';
  scanner.skip_blanks();
  return blank && (word == "since" || word == "after" || word == "from" || word == "ref");
}

/// value * unit, rounded to the microsecond; coarser where the value itself is (header).
Instant counted(double value, std::int64_t unit_us) {
  const double whole = std::floor(value);
  const double unit = static_cast<double>(unit_us);
  const auto exact = static_cast<std::int64_t>(whole) * unit_us + std::llround((value - whole) * unit);
  const double last_place =
      (std::nextafter(std::fabs(value), std::numeric_limits<double>::infinity()) - std::fabs(value)) * unit;
  if (value == whole || last_place < 1) return exact;
  for (const std::int64_t step : {kSecond, kMillisecond}) {
    const std::int64_t round = floor_div(exact + step / 2, step) * step;
    if (static_cast<double>(std::abs(round - exact)) <= last_place) return round;
  }
  return exact;
}

void tell(std::string* odd, const std::string& text) {
  if (odd != nullptr) *odd += (odd->empty() ? "" : "; ") + text;
}

}  // namespace

TimeUnits TimeUnits::parse(const std::string& units, const Calendar& calendar, const std::string& place,
                           std::string* odd) {
  const auto fail = [&](const std::string& why) {
    return Error(Failure::data, place, fmt::format("time units '{}' {}", shortened(units), why));
  };
  Scanner scanner(units);
  scanner.skip_blanks();
  const std::string word = scanner.word();
  const UnitName* unit = find_unit(word);
  if (unit == nullptr) {
    throw fail("do not begin with a unit of time; expected e.g. 'days since 1850-01-01'");
  }
  if (!accept_since(scanner)) throw fail("have no reference date; expected e.g. 'days since 1850-01-01'");
  const auto ref = reference(scanner);
  if (!ref) throw fail("have a reference that cannot be read; expected e.g. 1850-01-01 00:00:00 or 1850-1-1T06:00Z");
  if (!calendar.valid(ref->date)) {
    throw fail(fmt::format("refer to {}, which the calendar{} does not have", to_string(ref->date),
                           calendar.cf_name().empty() ? "" : " " + calendar.cf_name()));
  }
  if (std::abs(calendar.day_number(ref->date)) > kMaxDays) throw fail("refer to a date out of range");
  const bool atomic = calendar.kind() == Calendar::Kind::utc || calendar.kind() == Calendar::Kind::tai;
  if (ref->has_offset && atomic) {
    throw fail(fmt::format("have a time zone, which the calendar {} does not allow", calendar.cf_name()));
  }

  TimeUnits result;
  result.calendar_ = calendar;
  result.reference_ = calendar.instant(ref->date) + ref->clock - ref->offset;
  result.unit_us_ = unit->microseconds;
  result.months_per_unit_ = unit->months;
  result.place_ = place;
  result.text_ = shortened(units);
  if (unit->months != 0) {
    if (ref->date.day != 1 || ref->offset != 0) {
      throw fail("count months or years from a date that is not a month's first day (UTC); expected days since");
    }
    tell(odd,
         fmt::format("time units '{}' are read as calendar {}", result.text_, unit->months == 1 ? "months" : "years"));
  }
  if (ref->date.year <= 0) {
    tell(odd, fmt::format("time units '{}' refer to year {}, read as the year {} before year 1", result.text_,
                          ref->date.year, 1 - std::int64_t{ref->date.year}));
  }
  if (calendar.kind() == Calendar::Kind::utc && ref->date < kUtcStart) {
    tell(odd,
         fmt::format("time units '{}' refer to a date before 1972, where days of 86400 s are counted", result.text_));
  }
  return result;
}

Instant TimeUnits::decode(double value) const {
  const double unit =
      unit_us_ == 0 ? months_per_unit_ * 31.0 * static_cast<double>(kDay) : static_cast<double>(unit_us_);
  const double past = value * unit;
  if (!(std::fabs(past) <= 2 * kMaxInstant && std::fabs(past + static_cast<double>(reference_)) <= kMaxInstant)) {
    throw Error(Failure::data, place_, fmt::format("time {} in '{}' is out of range", value, text_));
  }
  if (unit_us_ == 0) {
    if (value != std::floor(value)) {
      throw Error(Failure::data, place_,
                  fmt::format("time {} in '{}' is no whole number of {}; expected days since", value, text_,
                              months_per_unit_ == 1 ? "months" : "years"));
    }
    const Date date = calendar_.date_of(reference_);
    const std::int64_t month =
        std::int64_t{date.year} * 12 + date.month - 1 + static_cast<std::int64_t>(value) * months_per_unit_;
    const Date target{static_cast<int>(floor_div(month, 12)), static_cast<int>(floor_mod(month, 12)) + 1, 1};
    return calendar_.instant(target) + floor_mod(reference_, kDay);
  }
  const Instant elapsed = counted(value, unit_us_);
  if (calendar_.kind() == Calendar::Kind::utc) return utc_instant(utc_elapsed(reference_) + elapsed);
  return reference_ + elapsed;
}

double TimeUnits::encode(Instant instant) const {
  if (unit_us_ == 0) {
    const Date from = calendar_.date_of(reference_), to = calendar_.date_of(instant);
    const std::int64_t months = (std::int64_t{to.year} - from.year) * 12 + to.month - from.month;
    if (to.day != 1 || floor_mod(instant, kDay) != floor_mod(reference_, kDay) || months % months_per_unit_ != 0) {
      throw Error(Failure::data, place_, fmt::format("{} is no whole number of steps of '{}'", to_string(to), text_));
    }
    const std::int64_t steps = months / months_per_unit_;
    return static_cast<double>(steps);
  }
  const bool utc = calendar_.kind() == Calendar::Kind::utc;
  const Instant past = utc ? utc_elapsed(instant) - utc_elapsed(reference_) : instant - reference_;
  const std::int64_t whole = floor_div(past, unit_us_);
  return static_cast<double>(whole) + static_cast<double>(past - whole * unit_us_) / static_cast<double>(unit_us_);
}

}  // namespace windrow::calendar
