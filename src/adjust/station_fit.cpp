// The transfer at one station: level and shape of the target from matched values and the calibration climate.
#include <cmath>

#include "matching.h"
#include "station_shape.h"
#include "windrow/adjust/transfer.h"

namespace windrow::adjust {
namespace {

bool present(double x) { return x == x; }

/// Takes the seasons that the series lacks from the normals. Returns whether one was taken.
bool complete_from(const Matched& normals, Matched& series) {
  bool taken = false;
  for (std::size_t s = 0; s < series.observed.size(); ++s) {
    if (present(series.observed[s]) || !present(normals.observed[s])) continue;
    series.observed[s] = normals.observed[s];
    series.modelled[s] = normals.modelled[s];
    taken = true;
  }
  return taken;
}

/// Level target and correction of one season; a reason when there is none.
std::string level(const Setup& setup, double calibration, double observed, double modelled, double& target,
                  double& correction) {
  if (!present(calibration)) return "the model has no value";
  if (!present(observed)) return "the station has no value that the run can be set against";
  if (!setup.multiplicative()) {
    correction = observed - modelled;
    target = calibration + correction;
    return {};
  }
  if (observed < 0) return "a ratio needs an observed mean that is not negative";
  if (modelled <= 0 || calibration <= 0) return "a ratio needs a model mean above zero";
  correction = observed > 0 ? std::log(observed / modelled) : -std::log(setup.max_ratio);
  target = std::log(calibration) + correction;
  return {};
}

}  // namespace

StationFit fit_station(const Setup& setup, const Steps& steps, std::span<const double> model,
                       const station::Record& record, const std::vector<double>& reduction,
                       std::pair<int, int> normals_period, bool accept_mismatch) {
  StationFit fit;
  Observed observed{record, {}};
  for (std::size_t m = 0; m < reduction.size() && m < 12; ++m) observed.reduction[m] = reduction[m];
  const RowClimate climate = fit_row(setup, steps, model);
  const ModelMonths months(setup, steps, model);
  const bool daily = setup.daily && !record.daily.day.empty();
  Matched matched = daily ? match_daily(setup, steps, model, months, observed, accept_mismatch)
                          : match_monthly(setup, months, observed, accept_mismatch);
  const bool series = daily || !record.monthly.empty();
  fit.months_matched = matched.months;
  fit.period_mismatch = series && matched.whole_period;
  if (!record.normal.empty()) {
    const Matched normals = match_normals(setup, months, observed, normals_period);
    if (complete_from(normals, matched)) {
      fit.period_mismatch = fit.period_mismatch || normals.whole_period;
      if (fit.months_matched == 0) fit.months_matched = normals.months;
    }
  } else if (series && matched.months == 0) {
    fit.left_out = "no month in common with the run";
    if (!accept_mismatch) fit.left_out += "; period_mismatch = \"accept\" uses it all the same";
    return fit;
  }
  const auto seasons = static_cast<std::size_t>(setup.seasons.count());
  fit.target_level.resize(seasons);
  fit.correction_level.resize(seasons);
  for (std::size_t s = 0; s < seasons; ++s) {
    const std::string reason = level(setup, climate.mean[s], matched.observed[s], matched.modelled[s],
                                     fit.target_level[s], fit.correction_level[s]);
    if (reason.empty()) continue;
    fit.left_out = reason + ": " + setup.seasons.name(static_cast<int>(s));
    fit.target_level.clear();
    fit.correction_level.clear();
    return fit;
  }
  fit.level = true;
  if (!matched.observed_sample.empty()) fit.shape = add_shape(setup, climate, matched, fit);
  return fit;
}

}  // namespace windrow::adjust
