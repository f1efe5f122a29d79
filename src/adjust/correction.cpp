// Correction tables of one cell from carried targets, and their evaluation. Tile code: + - * / and comparisons only,
// and gamma distributions where they are asked for. Wet days have their own file.
#include <algorithm>

#include "blend.h"
#include "det_exp.h"
#include "wet_days.h"
#include "windrow/adjust/transfer.h"
#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

/// The level a season shall have: additive methods.
double level_of(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season) {
  const double own = climate.mean[season];
  const double carried = at(target.level, season);
  return blend(target.fade_level, setup.carry_target ? carried : own + carried,
               own + at(target.mean_correction_level, season));
}

/// Daily ratios from smoothed monthly ones: never negative, and rescaled so that the calibration total of each month is
/// the monthly ratio times the model's.
void rescale(const RowClimate& climate, std::span<const double> monthly, std::span<double> daily) {
  double given[12] = {}, made[12] = {};
  const auto months = climate.smoothing->months();
  for (std::size_t s = 0; s < daily.size(); ++s) {
    daily[s] = daily[s] > 0 ? daily[s] : 0;
    given[months[s]] += climate.slot_sum[s];
    made[months[s]] += climate.slot_sum[s] * daily[s];
  }
  for (std::size_t s = 0; s < daily.size(); ++s) {
    const std::size_t m = months[s];
    // Smoothed to nothing wherever it rains: the plain ratio keeps the total.
    daily[s] = made[m] > 0 ? daily[s] * (monthly[m] * given[m] / made[m]) : monthly[m];
  }
}

void spread_to_days(const Setup& setup, const RowClimate& climate, std::vector<double>& table) {
  double monthly[12];
  std::copy_n(table.begin(), 12, monthly);
  table.resize(climate.smoothing->slots());
  const bool complete = std::all_of(monthly, monthly + 12, [](double v) { return v == v; });
  if (!complete) {
    const auto months = climate.smoothing->months();
    for (std::size_t s = 0; s < table.size(); ++s) table[s] = monthly[months[s]];
    return;
  }
  climate.smoothing->spread(monthly, table);
  if (setup.multiplicative()) rescale(climate, monthly, table);
}

/// One season of quantile-mapping; `out` becomes target - own nodes. Returns the nodes moved.
int map_season(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season,
               std::span<double> out) {
  const std::size_t n = out.size();
  const double* node = climate.node.data() + season * n;
  const double* weight = climate.node_weight.data() + season * n;
  const double own = climate.mean[season];
  const double level = level_of(setup, climate, target, season);
  const double fade = target.shape.empty() ? 0 : target.fade_shape;
  for (std::size_t k = 0; k < n; ++k) {
    const std::size_t i = season * n + k;
    const double shape = node[k] - own;
    const double carried = at(target.shape, i);
    out[k] = level +
             blend(fade, setup.carry_target ? carried : shape + carried, shape + at(target.mean_correction_shape, i));
  }
  const int moved = stats::make_non_decreasing(out);
  double mean = own;
  for (std::size_t k = 0; k < n; ++k) {
    out[k] -= node[k];
    mean += weight[k] * out[k];
  }
  for (std::size_t k = 0; k < n; ++k) out[k] += level - mean;
  return moved;
}

/// Factor and offset of one season of variance-scaling: (x - own) * ratio + level.
void scale_season(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season,
                  Correction& out) {
  const double own = climate.deviation[season], level = level_of(setup, climate, target, season);
  double ratio = 1;
  if (own > 0) {
    const double near =
        setup.carry_target ? det_exp(at(target.shape, season)) / own : det_exp(at(target.shape, season));
    ratio =
        blend(target.shape.empty() ? 0 : target.fade_shape, near, det_exp(at(target.mean_correction_shape, season)));
    ratio = capped(setup, ratio, out.capped);
  }
  out.table[2 * season] = ratio;
  out.table[2 * season + 1] = level - ratio * climate.mean[season];
}

}  // namespace

double season_ratio(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season,
                    int& caps) {
  const double own = climate.mean[season];
  if (!(own == own)) return own;
  if (own <= 0) {
    ++caps;
    return 1;
  }
  double near = 1, far = 1;
  if (target.fade_level > 0) {
    near = det_exp(at(target.level, season));
    if (setup.carry_target) near /= own;
  }
  if (target.fade_level < 1) far = det_exp(at(target.mean_correction_level, season));
  return capped(setup, blend(target.fade_level, near, far), caps);
}

void make_correction(const Setup& setup, const Steps& anchor_steps, const RowClimate& climate,
                     std::span<const double> anchor_series, const CellTarget& target, const CellDraws* draws,
                     Correction& out) {
  const std::size_t seasons = climate.mean.size();
  out.reordered = out.capped = 0;
  if (setup.wet_days()) return make_wet_correction(setup, anchor_steps, climate, anchor_series, target, draws, out);
  if (setup.maps_quantiles()) {
    const auto quantiles = static_cast<std::size_t>(setup.quantiles);
    out.table.resize(seasons * quantiles);
    for (std::size_t s = 0; s < seasons; ++s) {
      const std::span<double> row = std::span(out.table).subspan(s * quantiles, quantiles);
      if (climate.mean[s] == climate.mean[s]) {
        out.reordered += map_season(setup, climate, target, s, row);
      } else {
        std::fill(row.begin(), row.end(), climate.mean[s]);
      }
    }
    return;
  }
  if (setup.method == Method::variance_scaling) {
    out.table.resize(2 * seasons);
    for (std::size_t s = 0; s < seasons; ++s) scale_season(setup, climate, target, s, out);
    return;
  }
  out.table.resize(seasons);
  for (std::size_t s = 0; s < seasons; ++s) {
    out.table[s] = setup.multiplicative() ? season_ratio(setup, climate, target, s, out.capped)
                                          : level_of(setup, climate, target, s) - climate.mean[s];
  }
  if (climate.smoothing) spread_to_days(setup, climate, out.table);
}

void evaluate(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
              const Correction& correction, const CellDraws* draws, std::span<double> out) {
  if (setup.wet_days()) return evaluate_wet(setup, steps, series, ranks, correction, draws, out);
  const std::size_t n = series.size();
  const double* x = series.data();
  const double* table = correction.table.data();
  double* y = out.data();
  if (setup.maps_quantiles()) {
    const auto quantiles = static_cast<std::size_t>(setup.quantiles);
    for (std::size_t t = 0; t < n; ++t) {
      const double* c = table + static_cast<std::size_t>(steps.season[t]) * quantiles + ranks.node[t];
      y[t] = x[t] + (c[0] + static_cast<double>(ranks.weight[t]) * (c[1] - c[0]));
    }
    return;
  }
  if (setup.method == Method::variance_scaling) {
    for (std::size_t t = 0; t < n; ++t) {
      const double* c = table + 2 * static_cast<std::size_t>(steps.season[t]);
      y[t] = x[t] * c[0] + c[1];
    }
    return;
  }
  if (steps.smoothing && correction.table.size() != steps.smoothing->slots()) {
    throw Error(Failure::defect, "adjustment", "the correction was made for the days of another calendar");
  }
  const std::int16_t* row = steps.smoothing ? steps.slot.data() : steps.season.data();
  if (setup.multiplicative()) {
    for (std::size_t t = 0; t < n; ++t) y[t] = x[t] * table[row[t]];
  } else {
    for (std::size_t t = 0; t < n; ++t) y[t] = x[t] + table[row[t]];
  }
}

}  // namespace windrow::adjust
