// Correction tables of one cell from carried targets, and their evaluation. Tile code: + - * / and comparisons only.
#include <algorithm>

#include "det_exp.h"
#include "windrow/adjust/transfer.h"
#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

/// fade * near + (1 - fade) * far, where a side without weight need not exist.
double blend(double fade, double near, double far) {
  if (fade >= 1) return near;
  if (fade <= 0) return far;
  return fade * near + (1 - fade) * far;
}

double at(std::span<const double> values, std::size_t i) { return values.empty() ? 0 : values[i]; }

/// The level a season shall have: additive methods.
double level_of(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season) {
  const double own = climate.mean[season];
  const double carried = at(target.level, season);
  return blend(target.fade_level, setup.carry_target ? carried : own + carried,
               own + at(target.mean_correction_level, season));
}

/// The ratio of a season, capped; counts caps and seasons whose own mean allows no ratio.
double ratio_of(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season,
                int& capped) {
  const double own = climate.mean[season];
  if (!(own == own)) return own;
  if (own <= 0) {
    ++capped;
    return 1;
  }
  double near = 1, far = 1;
  if (target.fade_level > 0) {
    near = det_exp(at(target.level, season));
    if (setup.carry_target) near /= own;
  }
  if (target.fade_level < 1) far = det_exp(at(target.mean_correction_level, season));
  const double ratio = blend(target.fade_level, near, far);
  if (ratio > setup.max_ratio || ratio < 1 / setup.max_ratio) {
    ++capped;
    return ratio > setup.max_ratio ? setup.max_ratio : 1 / setup.max_ratio;
  }
  return ratio;
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

}  // namespace

void make_correction(const Setup& setup, const RowClimate& climate, const CellTarget& target, Correction& out) {
  const std::size_t seasons = climate.mean.size();
  out.reordered = out.capped = 0;
  if (setup.method == Method::quantile_mapping) {
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
  out.table.resize(seasons);
  for (std::size_t s = 0; s < seasons; ++s) {
    out.table[s] = setup.multiplicative() ? ratio_of(setup, climate, target, s, out.capped)
                                          : level_of(setup, climate, target, s) - climate.mean[s];
  }
  if (climate.smoothing) spread_to_days(setup, climate, out.table);
}

void evaluate(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
              const Correction& correction, std::span<double> out) {
  const std::size_t n = series.size();
  const double* x = series.data();
  const double* table = correction.table.data();
  double* y = out.data();
  if (setup.method == Method::quantile_mapping) {
    const auto quantiles = static_cast<std::size_t>(setup.quantiles);
    for (std::size_t t = 0; t < n; ++t) {
      const double* c = table + static_cast<std::size_t>(steps.season[t]) * quantiles + ranks.node[t];
      y[t] = x[t] + (c[0] + static_cast<double>(ranks.weight[t]) * (c[1] - c[0]));
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
