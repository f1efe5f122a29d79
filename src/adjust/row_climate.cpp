// The anchor run's calibration climate at one place, and ranks within it.
#include <algorithm>
#include <limits>

#include "ranking.h"
#include "windrow/adjust/transfer.h"
#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

constexpr double kMissing = std::numeric_limits<double>::quiet_NaN();

/// Nodes of an ascending sample.
void set_nodes(std::span<const double> ascending, std::span<double> nodes) {
  const std::size_t n = nodes.size();
  for (std::size_t k = 0; k < n; ++k) nodes[k] = stats::quantile(ascending, node_tau(k, n), 7);
  // Interpolation may break the order by a rounding.
  for (std::size_t k = 1; k < n; ++k) nodes[k] = std::max(nodes[k], nodes[k - 1]);
}

/// The same, and the mean weight of each node over the sample.
void fit_nodes(std::span<const double> ascending, std::span<double> nodes, std::span<double> weights, NodeRow& row) {
  const std::size_t n = nodes.size();
  set_nodes(ascending, nodes);
  row.set(nodes);
  std::size_t below = 0;
  for (const double x : ascending) {
    while (below < n && nodes[below] <= x) ++below;
    const Standing place = row.standing(x, below);
    weights[place.node] += 1 - static_cast<double>(place.weight);
    weights[place.node + std::size_t{1}] += static_cast<double>(place.weight);
  }
  for (double& w : weights) w /= static_cast<double>(ascending.size());
}

/// The values of one group of steps, without missing ones.
void collect(const StepGroups& groups, std::size_t group, std::span<const double> series, std::vector<double>& out) {
  out.clear();
  for (std::uint32_t i = groups.start[group]; i < groups.start[group + 1]; ++i) {
    const double x = series[groups.step[i]];
    if (x == x) out.push_back(x);
  }
}

/// Mean of the run's own window less the calibration's, or over it (detrended-quantile-mapping): [window * seasons].
std::vector<double> window_changes(const Setup& setup, const Steps& steps, const RowClimate& climate,
                                   std::span<const double> series) {
  std::vector<double> out(steps.window_sample.start.size() - 1), values;
  for (std::size_t g = 0; g < out.size(); ++g) {
    collect(steps.window_sample, g, series, values);
    const double own = values.empty() ? kMissing : stats::mean(values);
    const double calibration = climate.mean[g % setup.season_count()];
    if (!setup.multiplicative()) {
      out[g] = own - calibration;
    } else {
      out[g] = own > 0 && calibration > 0 ? own / calibration : 1;
    }
  }
  return out;
}

/// Fractional place of x in an ascending sample: ties in their middle, values beyond at the ends.
double place_in(std::span<const double> ascending, double x) {
  const auto [lower, upper] = std::equal_range(ascending.begin(), ascending.end(), x);
  const auto below = static_cast<double>(lower - ascending.begin());
  if (lower != upper) return below + 0.5 * static_cast<double>(upper - lower - 1);
  if (lower == ascending.begin()) return 0;
  if (upper == ascending.end()) return below - 1;
  return below - 1 + (x - lower[-1]) / (*lower - lower[-1]);
}

std::size_t group_of(const Setup& setup, const Steps& steps, std::size_t step) {
  return static_cast<std::size_t>(steps.window[step]) * setup.season_count() +
         static_cast<std::size_t>(steps.season[step]);
}

/// Places of a run's values in its own windows, or the windows' changes, where wet and dry days are told apart.
void place_series(const Setup& setup, const Steps& steps, const RowClimate& climate, std::span<const double> series,
                  Ranks& ranks) {
  if (setup.method == Method::detrended_quantile_mapping) {
    const std::vector<double> change = window_changes(setup, steps, climate, series);
    for (std::size_t t = 0; t < series.size(); ++t) ranks.change.push_back(change[group_of(setup, steps, t)]);
  }
  if (setup.method == Method::quantile_delta_mapping) {
    ranks.place.assign(series.size(), kMissing);
    ranks.sample.resize(steps.window_sample.start.size() - 1);
    for (std::size_t g = 0; g < ranks.sample.size(); ++g) {
      collect(steps.window_sample, g, series, ranks.sample[g]);
      std::sort(ranks.sample[g].begin(), ranks.sample[g].end());
    }
  }
  for (std::size_t t = 0; t < series.size(); ++t) {
    const double x = series[t];
    if (!(x == x)) continue;
    if (!ranks.sample.empty()) ranks.place[t] = place_in(ranks.sample[group_of(setup, steps, t)], x);
    const std::vector<double>& calibrated = climate.sample[static_cast<std::size_t>(steps.season[t])];
    if (calibrated.empty()) continue;
    if (x < calibrated.front()) ranks.tail[t] = 1;
    if (x > calibrated.back()) ranks.tail[t] = 2;
  }
}

}  // namespace

RowClimate fit_row(const Setup& setup, const Steps& steps, std::span<const double> series) {
  const std::size_t seasons = setup.season_count();
  const bool nodes = setup.maps_quantiles() && !setup.wet_days();
  const auto quantiles = static_cast<std::size_t>(nodes ? setup.quantiles : 0);
  RowClimate climate;
  climate.smoothing = steps.smoothing;
  climate.mean.assign(seasons, kMissing);
  climate.deviation.assign(setup.method == Method::variance_scaling ? seasons : 0, kMissing);
  climate.node.assign(seasons * quantiles, kMissing);
  climate.node_weight.assign(seasons * quantiles, 0.0);
  climate.sample.resize(setup.wet_days() ? seasons : 0);
  thread_local std::vector<double> values;
  thread_local NodeRow row;
  for (std::size_t s = 0; s < seasons; ++s) {
    collect(steps.sample, s, series, values);
    if (values.empty()) continue;
    climate.mean[s] = stats::mean(values);
    if (!climate.deviation.empty()) climate.deviation[s] = stats::standard_deviation(values);
    if (!nodes && !setup.wet_days()) continue;
    std::sort(values.begin(), values.end());
    if (setup.wet_days()) {
      climate.sample[s] = values;
      continue;
    }
    fit_nodes(values, std::span(climate.node).subspan(s * quantiles, quantiles),
              std::span(climate.node_weight).subspan(s * quantiles, quantiles), row);
  }
  if (steps.smoothing && setup.multiplicative()) {
    climate.slot_sum.assign(steps.smoothing->slots(), 0.0);
    for (std::size_t t = 0; t < series.size(); ++t) {
      if (steps.in_period[t] && series[t] == series[t])
        climate.slot_sum[static_cast<std::size_t>(steps.slot[t])] += series[t];
    }
  }
  return climate;
}

namespace {

/// Nodes of the run's own windows: [(window * seasons + season) * quantiles].
std::vector<double> window_nodes(const Setup& setup, const Steps& steps, std::span<const double> series) {
  const auto quantiles = static_cast<std::size_t>(setup.quantiles);
  const std::size_t groups = steps.window_sample.start.size() - 1;
  std::vector<double> nodes(groups * quantiles, kMissing), values;
  for (std::size_t g = 0; g < groups; ++g) {
    collect(steps.window_sample, g, series, values);
    if (values.empty()) continue;
    std::sort(values.begin(), values.end());
    set_nodes(values, std::span(nodes).subspan(g * quantiles, quantiles));
  }
  return nodes;
}

}  // namespace

void rank_series(const Setup& setup, const Steps& steps, const RowClimate& climate, std::span<const double> series,
                 Ranks& ranks) {
  ranks.tail.assign(series.size(), 0);
  ranks.node.clear();
  ranks.change.clear();
  if (setup.wet_days()) return place_series(setup, steps, climate, series, ranks);
  if (!setup.maps_quantiles()) return;
  const bool own = setup.method == Method::quantile_delta_mapping;
  const bool detrended = setup.method == Method::detrended_quantile_mapping;
  const auto quantiles = static_cast<std::size_t>(setup.quantiles);
  const std::vector<double> own_nodes = own ? window_nodes(setup, steps, series) : std::vector<double>{};
  const std::vector<double> change = detrended ? window_changes(setup, steps, climate, series) : std::vector<double>{};
  const std::vector<double>& nodes = own ? own_nodes : climate.node;
  thread_local std::vector<NodeRow> rows;
  rows.resize(nodes.size() / quantiles);
  for (std::size_t g = 0; g < rows.size(); ++g) rows[g].set(std::span(nodes).subspan(g * quantiles, quantiles));
  ranks.node.resize(series.size());
  ranks.weight.resize(series.size());
  for (std::size_t t = 0; t < series.size(); ++t) {
    const auto season = static_cast<std::size_t>(steps.season[t]);
    const std::size_t group = steps.window.empty() ? season : group_of(setup, steps, t);
    const double x = detrended ? series[t] - change[group] : series[t];
    const NodeRow& row = rows[own ? group : season];
    const std::size_t below = row.count_below(x);
    const Standing place = row.standing(x, below);
    ranks.node[t] = place.node;
    ranks.weight[t] = place.weight;
    // A missing value, or a season without nodes, compares false and is neither.
    const double* calibrated = climate.node.data() + season * quantiles;
    if (x < calibrated[0]) ranks.tail[t] = 1;
    if (x > calibrated[quantiles - 1]) ranks.tail[t] = 2;
  }
}

}  // namespace windrow::adjust
