// Shapes at a station: what its days say beyond the season's mean.
#include "station_shape.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "ranking.h"
#include "windrow/stats/gamma.h"
#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

/// Fewer wet days than this in a season say nothing about their distribution: those of all seasons stand in.
constexpr std::size_t kFewestWet = 10;

double logit(double p) { return std::log(p / (1 - p)); }

/// Logarithms of the wet nodes; of a gamma distribution with gamma-mapping.
std::vector<double> log_nodes(const Setup& setup, std::span<const double> wet) {
  std::vector<double> out(static_cast<std::size_t>(setup.quantiles));
  const bool gamma = setup.method == Method::gamma_mapping && wet.front() < wet.back();
  const stats::Gamma fit = gamma ? stats::fit_gamma(wet) : stats::Gamma{};
  for (std::size_t k = 0; k < out.size(); ++k) {
    const double tau = node_tau(k, out.size());
    out[k] = std::log(gamma ? stats::gamma_quantile(fit, tau) : stats::quantile(wet, tau, 7));
  }
  return out;
}

/// The season's values at or above the threshold, or all seasons' where those are too few.
std::vector<double> wet_part(const std::vector<std::vector<double>>& samples, std::size_t season,
                             const std::vector<double>& threshold) {
  const auto from = [&](std::size_t s) { return std::lower_bound(samples[s].begin(), samples[s].end(), threshold[s]); };
  std::vector<double> out(from(season), samples[season].end());
  if (out.size() >= kFewestWet) return out;
  out.clear();
  for (std::size_t s = 0; s < samples.size(); ++s) out.insert(out.end(), from(s), samples[s].end());
  std::sort(out.begin(), out.end());
  return out;
}

bool add_wet_shape(const Setup& setup, const RowClimate& climate, const Matched& matched, StationFit& fit) {
  const std::size_t seasons = setup.season_count(), width = setup.width(), first = setup.first_node();
  const double none = std::numeric_limits<double>::min();  // every value above zero is wet
  std::vector<double> observed_wet(seasons, first == 0 ? none : setup.wet_day), model_wet(seasons, none);
  for (std::size_t s = 0; s < seasons && first == 1; ++s) {
    const double correction = logit(wet_share(matched.observed_sample[s], setup.wet_day)) -
                              logit(wet_share(matched.modelled_sample[s], setup.wet_day));
    fit.correction_shape[s * width] = correction;
    fit.target_shape[s * width] = logit(wet_share(climate.sample[s], setup.wet_day)) + correction;
    const double p = 1 / (1 + std::exp(-fit.target_shape[s * width]));
    model_wet[s] = split_wet(setup, climate.sample[s], p).threshold;
  }
  if (!setup.maps_quantiles()) return true;
  for (std::size_t s = 0; s < seasons; ++s) {
    const auto observed = wet_part(matched.observed_sample, s, observed_wet);
    const auto modelled = wet_part(matched.modelled_sample, s, model_wet);
    const auto calibration = wet_part(climate.sample, s, model_wet);
    if (observed.empty() || modelled.empty() || calibration.empty()) return false;
    const auto o = log_nodes(setup, observed), m = log_nodes(setup, modelled), c = log_nodes(setup, calibration);
    for (std::size_t k = 0; k < o.size(); ++k) {
      fit.target_shape[s * width + first + k] = c[k] + (o[k] - m[k]) - fit.target_level[s];
      fit.correction_shape[s * width + first + k] = o[k] - m[k];
    }
  }
  return true;
}

void add_quantiles(const Setup& setup, const RowClimate& climate, const Matched& matched, std::size_t season,
                   StationFit& fit) {
  const std::size_t n = setup.width();
  for (std::size_t k = 0; k < n; ++k) {
    const double tau = node_tau(k, n);
    const double correction = stats::quantile(matched.observed_sample[season], tau, 7) -
                              stats::quantile(matched.modelled_sample[season], tau, 7);
    fit.target_shape[season * n + k] = climate.node[season * n + k] + correction - fit.target_level[season];
    fit.correction_shape[season * n + k] = correction - fit.correction_level[season];
  }
}

bool add_deviation(const RowClimate& climate, const Matched& matched, std::size_t season, StationFit& fit) {
  const double correction = std::log(stats::standard_deviation(matched.observed_sample[season]) /
                                     stats::standard_deviation(matched.modelled_sample[season]));
  fit.correction_shape[season] = correction;
  fit.target_shape[season] = std::log(climate.deviation[season]) + correction;
  return std::isfinite(fit.target_shape[season]);
}

}  // namespace

double wet_share(std::span<const double> ascending, double wet_day) {
  const auto wet = ascending.end() - std::lower_bound(ascending.begin(), ascending.end(), wet_day);
  return (static_cast<double>(wet) + 0.5) / (static_cast<double>(ascending.size()) + 1);
}

WetSplit split_wet(const Setup& setup, std::span<const double> ascending, double p) {
  WetSplit out;
  const std::size_t n = ascending.size();
  const double count = p * (static_cast<double>(n) + 1) - 0.5;
  const auto wet = static_cast<std::size_t>(std::clamp(std::floor(count + 0.5), 1.0, static_cast<double>(n)));
  out.threshold = std::max(ascending[n - wet], setup.wet_day / setup.max_ratio);
  const auto below = [&](double x) {
    return static_cast<std::size_t>(std::lower_bound(ascending.begin(), ascending.end(), x) - ascending.begin());
  };
  out.below = below(out.threshold);
  const std::size_t dry = below(setup.wet_day);
  out.excess = out.below > dry ? out.below - dry : 0;
  out.drawn = wet > n - out.below ? wet - (n - out.below) : 0;
  return out;
}

bool add_shape(const Setup& setup, const RowClimate& climate, const Matched& matched, StationFit& fit) {
  fit.target_shape.resize(setup.season_count() * setup.width());
  fit.correction_shape.resize(fit.target_shape.size());
  bool complete = true;
  for (std::size_t s = 0; s < setup.season_count(); ++s) {
    complete = complete && !matched.observed_sample[s].empty() && !matched.modelled_sample[s].empty();
  }
  if (complete && setup.wet_days()) {
    complete = add_wet_shape(setup, climate, matched, fit);
  } else {
    for (std::size_t s = 0; complete && s < setup.season_count(); ++s) {
      if (setup.method == Method::variance_scaling) {
        complete = add_deviation(climate, matched, s, fit);
      } else {
        add_quantiles(setup, climate, matched, s, fit);
      }
    }
  }
  if (!complete) {
    fit.target_shape.clear();
    fit.correction_shape.clear();
  }
  return complete;
}

}  // namespace windrow::adjust
