// Time axes. CF 1.13 section 4.4 (units and calendars), 7.1 (bounds inherit units and calendar), 7.4 (climatologies).
#include "time_axis.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdlib>
#include <limits>
#include <utility>

#include "windrow/calendar/time_units.h"

namespace windrow::cf {

namespace {

using calendar::Calendar;
using calendar::Instant;
using calendar::kDay;

constexpr Instant kSecond = 1'000'000;
constexpr Instant kSnap = 50'000;  ///< half of what a sixth decimal of a day is worth, rounded up

bool near(Instant a, Instant b) { return std::abs(a - b) <= kSecond; }

/// Months since year 0 of the month that contains the instant.
std::int64_t month_number(const Calendar& calendar, Instant instant) {
  const calendar::Date date = calendar.date_of(instant);
  return std::int64_t(date.year) * 12 + date.month - 1;
}

Instant month_start(const Calendar& calendar, std::int64_t month) {
  const std::int64_t year = month >= 0 ? month / 12 : -((-month + 11) / 12);
  return calendar.instant({int(year), int(month - year * 12) + 1, 1});
}

std::string date_text(const Calendar& calendar, Instant instant) {
  std::string text = to_string(calendar.date_of(instant));
  const Instant in_day = instant - calendar.instant(calendar.date_of(instant));
  if (in_day != 0) text += fmt::format(" {:02}:{:02}", in_day / (3600 * kSecond), in_day / (60 * kSecond) % 60);
  return text;
}

Calendar calendar_of(const Header& header, const nc::Var& coordinate, Remarks& remarks) {
  const std::string place = fmt::format("{}: {}", header.path, coordinate.name);
  if (const nc::Att* lengths = coordinate.find("month_lengths"); lengths != nullptr) {
    if (lengths->numbers.size() != 12)
      throw Error(Failure::data, place,
                  fmt::format("month_lengths has {} numbers, 12 were expected", lengths->numbers.size()));
    std::array<int, 12> months{};
    for (std::size_t i = 0; i < 12; ++i) months[i] = int(lengths->numbers[i]);
    const auto number = [&](const char* name, int otherwise) {
      const nc::Att* att = coordinate.find(name);
      return att != nullptr && !att->numbers.empty() ? int(att->numbers[0]) : otherwise;
    };
    return Calendar::custom(months, number("leap_year", 0), number("leap_month", 2));
  }
  const std::string name = coordinate.text("calendar");
  if (name.empty())
    remarks.push_back(
        fmt::format("time axis '{}' names no calendar; CF's default, standard, is used", coordinate.name));
  return Calendar::from_cf(name, place);
}

void refuse_missing(const Header& header, const nc::Var& coordinate, const std::vector<double>& values) {
  const nc::Att* fill = coordinate.find("_FillValue");
  const double missing = fill != nullptr && !fill->numbers.empty() ? fill->numbers[0] : NC_FILL_DOUBLE;
  for (std::size_t i = 0; i < values.size(); ++i)
    if (values[i] == missing || std::abs(values[i]) > 1e17)
      throw Error(Failure::data, header.path,
                  fmt::format("time axis '{}' has no value at position {}", coordinate.name, i));
}

void read_bounds(const nc::File& file, const Header& header, const nc::Var& coordinate, FileTime& time,
                 const calendar::TimeUnits& units, Remarks& remarks) {
  const std::string name = coordinate.text("bounds");
  if (name.empty()) return;
  const nc::Var* bounds = header.find(name);
  const auto unused = [&](const std::string& why) {
    remarks.push_back(fmt::format("time bounds '{}' are not used: {}", name, why));
  };
  if (bounds == nullptr) return unused("they are not in the file");
  if (bounds->dims.size() != 2 || bounds->dims[0] != coordinate.dims[0] || header.dim(bounds->dims[1]).length != 2)
    return unused(fmt::format("their shape is {}", header.shape_text(*bounds)));
  calendar::TimeUnits own = units;
  if (const std::string text = bounds->text("units"); !text.empty() && text != coordinate.text("units"))
    own = calendar::TimeUnits::parse(text, time.calendar, fmt::format("{}: {}", header.path, name));
  const std::vector<double> values = coordinate_values(file, *bounds, &coordinate);
  refuse_missing(header, *bounds, values);

  std::vector<TimeStep> steps = time.steps;
  std::size_t turned = 0, outside = 0, empty = 0, overlapping = 0;
  for (std::size_t i = 0; i < steps.size(); ++i) {
    TimeStep& step = steps[i];
    step.begin = snapped(own.decode(values[2 * i]));
    step.end = snapped(own.decode(values[2 * i + 1]));
    if (step.begin > step.end) {
      std::swap(step.begin, step.end);
      ++turned;
    }
    empty += step.begin == step.end;
    outside += step.time < step.begin - kSecond || step.time > step.end + kSecond;
    overlapping += i > 0 && step.begin < steps[i - 1].end - kSecond;
  }
  if (empty > 0) return unused(fmt::format("{} of {} have no length", empty, steps.size()));
  if (outside == steps.size()) return unused("none holds its time");
  if (turned > 0) remarks.push_back(fmt::format("{} pairs of time bounds '{}' are put in order", turned, name));
  if (outside > 0) remarks.push_back(fmt::format("{} time bounds '{}' do not hold their time", outside, name));
  if (overlapping > 0) remarks.push_back(fmt::format("{} time bounds '{}' overlap the one before", overlapping, name));
  time.steps = std::move(steps);
  time.bounds = true;
}

template <class Condition>
bool all(const std::vector<TimeStep>& steps, Condition condition) {
  return !steps.empty() && std::ranges::all_of(steps, condition);
}

/// Median of the differences between neighbours.
template <class Number>
std::int64_t median_difference(const std::vector<TimeStep>& steps, Number number) {
  std::vector<std::int64_t> differences;
  for (std::size_t i = 1; i < steps.size(); ++i) differences.push_back(number(steps[i]) - number(steps[i - 1]));
  const auto middle = differences.begin() + std::ptrdiff_t(differences.size() / 2);
  std::ranges::nth_element(differences, middle);
  return *middle;
}

}  // namespace

Instant snapped(Instant instant) {
  const Instant rest = ((instant % kSecond) + kSecond) % kSecond;
  if (rest <= kSnap) return instant - rest;
  if (rest >= kSecond - kSnap) return instant + (kSecond - rest);
  return instant;
}

FileTime read_time(const nc::File& file, const Header& header, const nc::Var& coordinate, Remarks& remarks) {
  if (!coordinate.text("climatology").empty())
    throw Error(Failure::data, header.path,
                fmt::format("time axis '{}' is climatological (averages over many years); a run's time axis is needed",
                            coordinate.name));
  FileTime time;
  time.calendar = calendar_of(header, coordinate, remarks);
  std::string odd;
  const auto units = calendar::TimeUnits::parse(coordinate.text("units"), time.calendar,
                                                fmt::format("{}: {}", header.path, coordinate.name), &odd);
  if (!odd.empty()) remarks.push_back(odd);
  const std::vector<double> values = coordinate_values(file, coordinate);
  if (values.empty()) throw Error(Failure::data, header.path, fmt::format("time axis '{}' is empty", coordinate.name));
  refuse_missing(header, coordinate, values);
  for (const double value : values) {
    const Instant instant = snapped(units.decode(value));
    if (!time.steps.empty() && instant <= time.steps.back().time)
      throw Error(Failure::data, header.path,
                  fmt::format("time axis '{}' does not ascend: {} follows {} (position {})", coordinate.name,
                              date_text(time.calendar, instant), date_text(time.calendar, time.steps.back().time),
                              time.steps.size()));
    time.steps.push_back({instant, instant, instant});
  }
  read_bounds(file, header, coordinate, time, units, remarks);
  return time;
}

Frequency frequency_of(const Calendar& calendar, const std::vector<TimeStep>& steps, bool bounds) {
  const auto middle = [](const TimeStep& step) { return step.begin + (step.end - step.begin) / 2; };
  const auto month_of_middle = [&](const TimeStep& step) { return month_number(calendar, middle(step)); };
  if (bounds) {
    if (all(steps, [](const TimeStep& step) { return near(step.end - step.begin, kDay); })) return Frequency::daily;
    const auto is_month = [](const TimeStep& step) {
      return step.end - step.begin >= 27 * kDay && step.end - step.begin <= 32 * kDay;
    };
    std::int64_t last = std::numeric_limits<std::int64_t>::min();
    const auto new_month = [&](const TimeStep& step) {
      const std::int64_t before = std::exchange(last, month_of_middle(step));
      return last > before;
    };
    if (all(steps, is_month) && all(steps, new_month)) return Frequency::monthly;
    return Frequency::other;
  }
  if (steps.size() < 2) return Frequency::other;
  const auto day = [](const TimeStep& step) { return step.time / kDay; };
  std::vector<std::int64_t> days;
  for (const TimeStep& step : steps) days.push_back(day(step));
  const bool own_days = std::ranges::adjacent_find(days) == days.end();
  if (own_days && near(median_difference(steps, [](const TimeStep& step) { return step.time; }), kDay))
    return Frequency::daily;
  const auto month = [&](const TimeStep& step) { return month_number(calendar, step.time); };
  std::vector<std::int64_t> months;
  for (const TimeStep& step : steps) months.push_back(month(step));
  if (std::ranges::adjacent_find(months) == months.end() && median_difference(steps, month) == 1)
    return Frequency::monthly;
  return Frequency::other;
}

void infer_cells(const Calendar& calendar, Frequency frequency, std::vector<TimeStep>& steps) {
  const std::size_t n = steps.size();
  for (std::size_t i = 0; i < n; ++i) {
    TimeStep& step = steps[i];
    if (frequency == Frequency::daily) {
      step.begin = calendar.instant(calendar.date_of(step.time));
      step.end = step.begin + kDay;
    } else if (frequency == Frequency::monthly) {
      const std::int64_t month = month_number(calendar, step.time);
      step.begin = month_start(calendar, month);
      step.end = month_start(calendar, month + 1);
    } else if (n > 1) {
      const Instant before = i > 0 ? step.time - steps[i - 1].time : steps[1].time - step.time;
      const Instant after = i + 1 < n ? steps[i + 1].time - step.time : before;
      step.begin = step.time - before / 2;
      step.end = step.time + after / 2;
    }
  }
}

std::vector<std::string> gap_remarks(const Calendar& calendar, Frequency frequency,
                                     const std::vector<TimeStep>& steps) {
  std::vector<std::string> remarks;
  if (steps.size() < 2) return remarks;
  const Instant usual = median_difference(steps, [](const TimeStep& step) { return step.time; });
  std::size_t count = 0;
  for (std::size_t i = 1; i < steps.size(); ++i) {
    const TimeStep &before = steps[i - 1], &after = steps[i];
    std::int64_t missing = 0;
    const char* unit = "day";
    if (frequency == Frequency::daily) {
      missing = (after.begin - before.end + kDay / 2) / kDay;
    } else if (frequency == Frequency::monthly) {
      const auto month = [&](const TimeStep& s) { return month_number(calendar, s.begin + (s.end - s.begin) / 2); };
      missing = month(after) - month(before) - 1;
      unit = "month";
    } else if (2 * (after.time - before.time) > 3 * usual) {
      missing = (after.time - before.time) / usual;
      unit = "usual time step";
    }
    if (missing <= 0) continue;
    if (++count <= 5)
      remarks.push_back(fmt::format("gap in time between {} and {}: {} {}{}", date_text(calendar, before.time),
                                    date_text(calendar, after.time), missing, unit, missing > 1 ? "s" : ""));
  }
  if (count > 5) remarks.push_back(fmt::format("and {} more gaps in time", count - 5));
  return remarks;
}

}  // namespace windrow::cf
