// What all series on one time axis share: seasons, slots and calibration samples.
#include <algorithm>
#include <limits>

#include "windrow/adjust/transfer.h"
#include "windrow/base/error.h"

namespace windrow::adjust {
namespace {

/// Steps by season as compressed rows, ascending in each season.
void gather(int seasons, const std::vector<std::vector<int>>& of_step, const std::vector<std::uint8_t>& use,
            std::vector<std::uint32_t>& start, std::vector<std::uint32_t>& step) {
  start.assign(static_cast<std::size_t>(seasons) + 1, 0);
  for (std::size_t t = 0; t < of_step.size(); ++t) {
    if (!use[t]) continue;
    for (const int s : of_step[t]) ++start[static_cast<std::size_t>(s) + 1];
  }
  for (std::size_t s = 1; s < start.size(); ++s) start[s] += start[s - 1];
  step.resize(start.back());
  std::vector<std::uint32_t> next(start.begin(), start.end() - 1);
  for (std::size_t t = 0; t < of_step.size(); ++t) {
    if (!use[t]) continue;
    for (const int s : of_step[t]) step[next[static_cast<std::size_t>(s)]++] = static_cast<std::uint32_t>(t);
  }
}

void check(const Setup& setup, const std::string& place) {
  if (!setup.daily && !setup.seasons.is_month()) {
    throw Error(Failure::job, place, "monthly model data need season = \"month\"");
  }
  if (setup.method == Method::quantile_mapping &&
      (setup.quantiles < 2 || setup.quantiles > std::numeric_limits<std::uint16_t>::max())) {
    throw Error(Failure::job, place, "quantiles must be 2 to 65535");
  }
}

}  // namespace

Steps make_steps(const Setup& setup, const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                 const std::optional<std::pair<calendar::Date, calendar::Date>>& period, bool calibrate,
                 const std::string& place) {
  check(setup, place);
  Steps steps;
  if (setup.smoothed()) steps.smoothing = MonthSmoothing::of(calendar);
  std::vector<std::vector<int>> seasons_of(calibrate ? dates.size() : 0);
  for (std::size_t t = 0; t < dates.size(); ++t) {
    const calendar::Date date = dates[t];
    steps.season.push_back(static_cast<std::int16_t>(setup.seasons.evaluation_season(calendar, date)));
    steps.year.push_back(date.year);
    steps.month.push_back(static_cast<std::uint8_t>(date.month - 1));
    steps.slot.push_back(static_cast<std::int16_t>(steps.smoothing ? steps.smoothing->slot(calendar, date) : -1));
    steps.in_period.push_back(!period || (period->first <= date && date <= period->second) ? 1 : 0);
    if (calibrate) setup.seasons.fitting_seasons(calendar, date, seasons_of[t]);
  }
  const int seasons = setup.seasons.count();
  gather(seasons, seasons_of, steps.in_period, steps.sample_start, steps.sample);
  gather(seasons, seasons_of, std::vector<std::uint8_t>(dates.size(), 1), steps.member_start, steps.member);
  for (int s = 0; calibrate && s < seasons; ++s) {
    const auto i = static_cast<std::size_t>(s);
    if (steps.sample_start[i] == steps.sample_start[i + 1]) {
      throw Error(Failure::data, place,
                  "no step of the calibration period falls into " + setup.seasons.name(s) +
                      "; choose a period that the anchor run covers");
    }
  }
  return steps;
}

}  // namespace windrow::adjust
