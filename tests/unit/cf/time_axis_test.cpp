// Laws of time axes: every CF calendar, bounds used where they make sense, cells inferred and reported where not.
#include <doctest/doctest.h>

#include "sample_run.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

struct TimeFile {
  std::vector<double> time = {};
  std::string units = "days since 2000-01-01", calendar = "standard";
  std::vector<double> bounds = {};
  std::function<void(FileBuilder&)> time_more = [](FileBuilder&) {}, bounds_more = [](FileBuilder&) {};

  [[nodiscard]] std::string write(const std::string& name = "time.nc") const {
    FileBuilder file(name);
    file.dim("time", NC_UNLIMITED).dim("lat", 2).dim("lon", 2).dim("two", 2);
    file.var("time", NC_DOUBLE, {"time"}, time).att("units", units);
    if (!calendar.empty()) file.att("calendar", calendar);
    if (!bounds.empty()) file.att("bounds", "time_bnds");
    time_more(file);
    if (!bounds.empty()) {
      file.var("time_bnds", NC_DOUBLE, {"time", "two"}, bounds);
      bounds_more(file);
    }
    file.var("lat", NC_DOUBLE, {"lat"}, {10, 20}).att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"lon"}, {10, 20}).att("units", "degrees_east");
    file.var("v", NC_FLOAT, {"time", "lat", "lon"}, std::vector<double>(time.size() * 4, 1));
    return file.done();
  }
};

std::string refusal(const TimeFile& file) {
  return error_text(Failure::data, [&] {
    Notices notices;
    cf::open_run({file.write()}, "v", notices);
  });
}

std::string date(const cf::RunVariable& run, calendar::Instant instant) {
  return to_string(run.calendar().date_of(instant));
}

}  // namespace

TEST_CASE("every CF calendar is read; a month is the calendar's own") {
  struct Case {
    const char* calendar;
    std::vector<double> mid_months;
    const char* end;
  };
  for (const Case& c :
       {Case{"standard", {15.5, 45, 75.5}, "2000-04-01"}, Case{"gregorian", {15.5, 45, 75.5}, "2000-04-01"},
        Case{"proleptic_gregorian", {15.5, 45, 75.5}, "2000-04-01"}, Case{"julian", {15.5, 45, 75.5}, "2000-04-01"},
        Case{"noleap", {15.5, 44.5, 74}, "2000-04-01"}, Case{"365_day", {15.5, 44.5, 74}, "2000-04-01"},
        Case{"all_leap", {15.5, 45, 75.5}, "2000-04-01"}, Case{"366_day", {15.5, 45, 75.5}, "2000-04-01"},
        Case{"360_day", {15, 45, 75}, "2000-04-01"}}) {
    CAPTURE(c.calendar);
    TimeFile file;
    file.time = c.mid_months;
    file.calendar = c.calendar;
    Notices notices;
    const auto run = cf::open_run({file.write()}, "v", notices);
    CHECK(run->frequency() == cf::Frequency::monthly);
    CHECK(date(*run, run->time().front().begin) == "2000-01-01");
    CHECK(date(*run, run->time().back().end) == c.end);
    CHECK(texts(notices) ==
          std::vector<std::string>{"time has no bounds; each value is taken for the calendar month that "
                                   "contains its time"});
  }
}

TEST_CASE("a calendar given by its month lengths is read") {
  TimeFile file;
  file.time = {0.5, 1.5, 34.5};
  file.calendar = "";
  file.time_more = [](FileBuilder& f) {
    f.att("month_lengths", NC_INT, {34, 31, 32, 30, 29, 27, 28, 28, 28, 32, 32, 34});  // CF 1.13 example 4.6
  };
  Notices notices;
  const auto run = cf::open_run({file.write()}, "v", notices);
  CHECK(date(*run, run->time()[2].time) == "2000-02-01");
  file.time_more = [](FileBuilder& f) { f.att("month_lengths", NC_INT, {34, 31}); };
  CHECK(refusal(file) == "time.nc: time: month_lengths has 2 numbers, 12 were expected");
}

TEST_CASE("days without bounds are the days that contain their times, at whatever hour, and a gap is reported") {
  for (const double hour : {0.0, 0.5, 0.99}) {
    TimeFile file;
    for (const double day : {0, 1, 2, 5, 6, 7, 8}) file.time.push_back(day + hour);
    Notices notices;
    const auto run = cf::open_run({file.write()}, "v", notices);
    CHECK(run->frequency() == cf::Frequency::daily);
    for (const cf::TimeStep& step : run->time()) {
      CHECK(step.end - step.begin == calendar::kDay);
      const bool inside = step.begin <= step.time && step.time < step.end;
      CHECK(inside);
    }
    CHECK(has(notices, "the day that contains its time"));
    CHECK(has(notices, "gap in time between 2000-01-03"));
    CHECK(has(notices, "2 days"));
  }
}

TEST_CASE("other spacings without bounds meet half-way") {
  TimeFile file;
  file.time = {0, 0.25, 0.5, 0.75};
  Notices notices;
  const auto run = cf::open_run({file.write()}, "v", notices);
  CHECK(run->frequency() == cf::Frequency::other);
  CHECK(run->time()[0].end == run->time()[1].begin);
  CHECK(run->time()[1].end - run->time()[1].begin == calendar::kDay / 4);
  CHECK(has(notices, "the time half-way to its neighbours"));
}

TEST_CASE("bounds decide frequency and cells; nothing is reported when all is in order") {
  TimeFile monthly{.time = {15.5, 45}, .bounds = {0, 31, 31, 60}};
  TimeFile daily{.time = {1, 2}, .bounds = {0, 1, 1, 2}};  // labelled at the end of the day
  TimeFile yearly{.time = {180, 540}, .calendar = "360_day", .bounds = {0, 360, 360, 720}};
  Notices notices;
  CHECK(cf::open_run({monthly.write()}, "v", notices)->frequency() == cf::Frequency::monthly);
  CHECK(cf::open_run({yearly.write()}, "v", notices)->frequency() == cf::Frequency::other);
  const auto run = cf::open_run({daily.write()}, "v", notices);
  CHECK(run->frequency() == cf::Frequency::daily);
  CHECK(date(*run, run->time()[0].begin) == "2000-01-01");
  CHECK(notices.list().empty());
}

TEST_CASE("bounds may have their own units, be turned, be without length or elsewhere; what is odd is reported") {
  TimeFile file{.time = {0.5, 1.5}, .bounds = {24, 48, 48, 72}};
  file.bounds_more = [](FileBuilder& f) { f.att("units", "hours since 1999-12-31"); };
  Notices none;
  const auto own = cf::open_run({file.write()}, "v", none);
  CHECK(date(*own, own->time()[0].begin) == "2000-01-01");
  CHECK(own->frequency() == cf::Frequency::daily);
  CHECK(none.list().empty());

  Notices turned;
  const auto run = cf::open_run({TimeFile{.time = {0.5, 1.5}, .bounds = {1, 0, 2, 1}}.write()}, "v", turned);
  CHECK(run->time()[0].begin < run->time()[0].end);
  CHECK(has(turned, "2 pairs of time bounds 'time_bnds' are put in order"));

  Notices flat;
  cf::open_run({TimeFile{.time = {0.5, 1.5}, .bounds = {0.5, 0.5, 1.5, 1.5}}.write()}, "v", flat);
  CHECK(has(flat, "time bounds 'time_bnds' are not used: 2 of 2 have no length"));

  Notices elsewhere;
  cf::open_run({TimeFile{.time = {0.5, 1.5}, .bounds = {100, 101, 101, 102}}.write()}, "v", elsewhere);
  CHECK(has(elsewhere, "time bounds 'time_bnds' are not used: none holds its time"));

  Notices missing;
  TimeFile without{.time = {0.5, 1.5}};
  without.time_more = [](FileBuilder& f) { f.att("bounds", "nowhere"); };
  cf::open_run({without.write()}, "v", missing);
  CHECK(has(missing, "time bounds 'nowhere' are not used: they are not in the file"));
}

TEST_CASE("decimal days of six digits are the second they were made from") {
  TimeFile file;
  file.time = {0.333333, 1.333333, 2.333333};  // 08:00
  Notices notices;
  const auto run = cf::open_run({file.write()}, "v", notices);
  for (const cf::TimeStep& step : run->time()) CHECK(step.time - step.begin == calendar::kDay / 3);
}

TEST_CASE("a missing calendar attribute is CF's default and reported") {
  TimeFile file{.time = {0.5, 1.5}, .calendar = ""};
  Notices notices;
  CHECK(cf::open_run({file.write()}, "v", notices)->calendar() == calendar::Calendar());
  CHECK(has(notices, "time axis 'time' names no calendar; CF's default, standard, is used"));
}

TEST_CASE("time axes that cannot be understood are errors") {
  CHECK(refusal({.time = {1, 2, 3}, .units = "Month"}) ==
        "time.nc: variable 'v': time axis 'time' has the units 'Month', which name no date; expected '<unit> since "
        "<date>'");
  CHECK(refusal({.time = {2, 1}}) ==
        "time.nc: time axis 'time' does not ascend: 2000-01-02 follows 2000-01-03 (position 1)");
  CHECK(refusal({.time = {1, 1}}) ==
        "time.nc: time axis 'time' does not ascend: 2000-01-02 follows 2000-01-02 (position 1)");
  CHECK(refusal({.time = {1, NC_FILL_DOUBLE}}) == "time.nc: time axis 'time' has no value at position 1");
  CHECK(refusal({.time = {}}) == "time.nc: time axis 'time' is empty");
  CHECK(refusal({.time = {1, 2}, .units = "fortnights since yesterday"}).starts_with("time.nc: time: "));
  CHECK(refusal({.time = {1, 2}, .calendar = "moon"}).starts_with("time.nc: time: "));
  TimeFile normals{.time = {15, 45}};
  normals.time_more = [](FileBuilder& f) { f.att("climatology", "climatology_bnds"); };
  CHECK(refusal(normals) ==
        "time.nc: time axis 'time' is climatological (averages over many years); a run's time axis is "
        "needed");
}

TEST_CASE("a single step whose units name no date makes a fixed field, and that is reported") {
  TimeFile file{.time = {36}, .units = "hours"};
  file.time_more = [](FileBuilder& f) { f.att("standard_name", "time"); };
  Notices notices;
  const auto run = cf::open_run({file.write()}, "v", notices);
  CHECK(run->frequency() == cf::Frequency::fixed);
  CHECK(run->time().size() == 1);
  CHECK(texts(notices) ==
        std::vector<std::string>{"the single time step of 'time' has the units 'hours', which name no "
                                 "date: 'v' is read as a fixed field"});
}
