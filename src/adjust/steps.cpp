// What all series on one time axis share: seasons, slots and calibration samples.
#include <algorithm>
#include <limits>

#include "windrow/adjust/setup.h"
#include "windrow/base/error.h"

namespace windrow::adjust {
namespace {

/// Steps by group, ascending in each; `of_step` may put a step into several groups.
StepGroups gather(std::size_t groups, const std::vector<std::vector<int>>& of_step,
                  const std::vector<std::uint8_t>& use) {
  StepGroups out;
  out.start.assign(groups + 1, 0);
  for (std::size_t t = 0; t < of_step.size(); ++t) {
    if (!use[t]) continue;
    for (const int s : of_step[t]) ++out.start[static_cast<std::size_t>(s) + 1];
  }
  for (std::size_t s = 1; s < out.start.size(); ++s) out.start[s] += out.start[s - 1];
  out.step.resize(out.start.back());
  std::vector<std::uint32_t> next(out.start.begin(), out.start.end() - 1);
  for (std::size_t t = 0; t < of_step.size(); ++t) {
    if (!use[t]) continue;
    for (const int s : of_step[t]) out.step[next[static_cast<std::size_t>(s)]++] = static_cast<std::uint32_t>(t);
  }
  return out;
}

/// Which window each step is seen in, and what each window's seasons consist of.
void add_windows(const Setup& setup, const std::vector<std::vector<int>>& seasons_of, Steps& steps) {
  if (steps.year.empty()) return;
  const auto [low, high] = std::minmax_element(steps.year.begin(), steps.year.end());
  const YearWindows windows = year_windows(*low, *high, setup.window_years, setup.window_step);
  steps.window_years = windows.years;
  const int seasons = setup.seasons.count();
  std::vector<std::vector<int>> groups(steps.year.size());
  for (std::size_t t = 0; t < steps.year.size(); ++t) {
    const int year = steps.year[t];
    steps.window.push_back(static_cast<std::int16_t>(windows.of(year)));
    for (std::size_t w = 0; w < windows.years.size(); ++w) {
      if (year < windows.years[w].first || year > windows.years[w].second) continue;
      for (const int s : seasons_of[t]) groups[t].push_back(static_cast<int>(w) * seasons + s);
    }
  }
  steps.window_sample =
      gather(windows.years.size() * setup.season_count(), groups, std::vector<std::uint8_t>(steps.year.size(), 1));
}

void check(const Setup& setup, const std::string& place) {
  if (!setup.daily && !setup.seasons.is_month()) {
    throw Error(Failure::job, place, "monthly model data need season = \"month\"");
  }
  if (setup.maps_quantiles() && (setup.quantiles < 2 || setup.quantiles > std::numeric_limits<std::uint16_t>::max())) {
    throw Error(Failure::job, place, "quantiles must be 2 to 65535");
  }
}

}  // namespace

Steps make_steps(const Setup& setup, const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                 const std::optional<std::pair<calendar::Date, calendar::Date>>& period, bool calibrate,
                 const std::string& place) {
  check(setup, place);
  Steps steps;
  steps.date = dates;
  if (setup.smoothed()) steps.smoothing = MonthSmoothing::of(calendar);
  const bool grouped = calibrate || setup.windowed();
  std::vector<std::vector<int>> seasons_of(grouped ? dates.size() : 0);
  for (std::size_t t = 0; t < dates.size(); ++t) {
    const calendar::Date date = dates[t];
    steps.season.push_back(static_cast<std::int16_t>(setup.seasons.evaluation_season(calendar, date)));
    steps.year.push_back(date.year);
    steps.month.push_back(static_cast<std::uint8_t>(date.month - 1));
    steps.slot.push_back(static_cast<std::int16_t>(steps.smoothing ? steps.smoothing->slot(calendar, date) : -1));
    steps.in_period.push_back(!period || (period->first <= date && date <= period->second) ? 1 : 0);
    if (grouped) setup.seasons.fitting_seasons(calendar, date, seasons_of[t]);
  }
  if (setup.windowed()) add_windows(setup, seasons_of, steps);
  if (!calibrate) return steps;
  steps.sample = gather(setup.season_count(), seasons_of, steps.in_period);
  steps.member = gather(setup.season_count(), seasons_of, std::vector<std::uint8_t>(dates.size(), 1));
  for (std::size_t s = 0; s < setup.season_count(); ++s) {
    if (steps.sample.start[s] == steps.sample.start[s + 1]) {
      throw Error(Failure::data, place,
                  "no step of the calibration period falls into " + setup.seasons.name(static_cast<int>(s)) +
                      "; choose a period that the anchor run covers");
    }
  }
  return steps;
}

YearWindows year_windows(int first_year, int last_year, int width, int step) {
  YearWindows out;
  out.first_year = first_year;
  out.step = step;
  const int blocks = (last_year - first_year + 1) / step;
  const int last_complete = first_year + blocks * step - 1;
  if (last_year - first_year + 1 < width || blocks == 0) {
    out.years.emplace_back(first_year, last_year);
    return out;
  }
  for (int block = 0; block < blocks; ++block) {
    // Windows that the complete blocks are too few for begin with the run.
    const int centred = first_year + block * step - (width - step) / 2;
    const int first = std::max(first_year, std::min(centred, last_complete - width + 1));
    const int last = first + width - 1;
    out.years.emplace_back(first, last <= last_complete ? last : std::min(last, last_year));
  }
  return out;
}

}  // namespace windrow::adjust
