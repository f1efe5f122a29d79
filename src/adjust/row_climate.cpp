// The anchor run's calibration climate at one place, and ranks within it.
#include <algorithm>
#include <limits>

#include "ranking.h"
#include "windrow/adjust/transfer.h"
#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

constexpr double kMissing = std::numeric_limits<double>::quiet_NaN();

/// Nodes of an ascending sample, and the mean weight of each node over the sample.
void fit_nodes(std::span<const double> ascending, std::span<double> nodes, std::span<double> weights, NodeRow& row) {
  const std::size_t n = nodes.size();
  for (std::size_t k = 0; k < n; ++k) {
    nodes[k] = stats::quantile(ascending, (static_cast<double>(k) + 0.5) / static_cast<double>(n), 7);
  }
  // Interpolation may break the order by a rounding.
  for (std::size_t k = 1; k < n; ++k) nodes[k] = std::max(nodes[k], nodes[k - 1]);
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

}  // namespace

RowClimate fit_row(const Setup& setup, const Steps& steps, std::span<const double> series) {
  const auto seasons = static_cast<std::size_t>(setup.seasons.count());
  const bool mapping = setup.method == Method::quantile_mapping;
  const auto quantiles = static_cast<std::size_t>(mapping ? setup.quantiles : 0);
  RowClimate climate;
  climate.smoothing = steps.smoothing;
  climate.mean.assign(seasons, kMissing);
  climate.node.assign(seasons * quantiles, kMissing);
  climate.node_weight.assign(seasons * quantiles, 0.0);
  thread_local std::vector<double> values;
  thread_local NodeRow row;
  for (std::size_t s = 0; s < seasons; ++s) {
    values.clear();
    for (std::uint32_t i = steps.sample_start[s]; i < steps.sample_start[s + 1]; ++i) {
      const double x = series[steps.sample[i]];
      if (x == x) values.push_back(x);
    }
    if (values.empty()) continue;
    climate.mean[s] = stats::mean(values);
    if (!mapping) continue;
    std::sort(values.begin(), values.end());
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

void rank_series(const Setup& setup, const Steps& steps, const RowClimate& climate, std::span<const double> series,
                 Ranks& ranks) {
  const auto seasons = static_cast<std::size_t>(setup.seasons.count());
  const auto quantiles = static_cast<std::size_t>(setup.quantiles);
  thread_local std::vector<NodeRow> rows;
  rows.resize(seasons);
  for (std::size_t s = 0; s < seasons; ++s) rows[s].set(std::span(climate.node).subspan(s * quantiles, quantiles));
  ranks.node.resize(series.size());
  ranks.weight.resize(series.size());
  ranks.tail.assign(series.size(), 0);
  for (std::size_t t = 0; t < series.size(); ++t) {
    const double x = series[t];
    const NodeRow& row = rows[static_cast<std::size_t>(steps.season[t])];
    const std::size_t below = row.count_below(x);
    const Standing place = row.standing(x, below);
    ranks.node[t] = place.node;
    ranks.weight[t] = place.weight;
    // A missing value, or a season without nodes, compares false and is neither.
    ranks.tail[t] = x < row.nodes().front() || x > row.nodes().back() ? 1 : 0;
  }
}

}  // namespace windrow::adjust
