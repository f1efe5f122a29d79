// Correlation against distance, and extremes of means over groups of stations.
#include "windrow/scores/areas.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

namespace windrow::scores {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

void check(const Days& days, const Field& observed, const Field& modelled) {
  bool sound = observed.size() == modelled.size();
  for (const Field* field : {&observed, &modelled}) {
    for (const auto& series : *field) sound = sound && series.size() == days.size();
  }
  if (!sound) {
    throw Error(Failure::defect, "points and areas",
                fmt::format("observed and product must have the same stations and {} days each", days.size()));
  }
}

/// Both correlations of stations a and b; NaN where days are too few.
std::array<double, 2> correlations(const std::vector<std::size_t>& in_season, const Field& observed,
                                   const Field& modelled, std::size_t a, std::size_t b, int fewest_days) {
  std::vector<double> observed_a, observed_b, modelled_a, modelled_b;
  for (const std::size_t i : in_season) {
    const double sum = observed[a][i] + observed[b][i] + modelled[a][i] + modelled[b][i];
    if (std::isnan(sum)) continue;
    observed_a.push_back(observed[a][i]);
    observed_b.push_back(observed[b][i]);
    modelled_a.push_back(modelled[a][i]);
    modelled_b.push_back(modelled[b][i]);
  }
  if (observed_a.size() < static_cast<std::size_t>(std::max(fewest_days, 2))) return {kNone, kNone};
  return {stats::correlation(observed_a, observed_b), stats::correlation(modelled_a, modelled_b)};
}

/// A score's ratio of modelled to observed, in every replicate and of all years.
class Ratio {
 public:
  explicit Ratio(Score score) : score_(score) {}

  void add(const Values& values) { replicates_.push_back(of(values).value); }
  [[nodiscard]] Estimate estimate(const Values& values) const { return {of(values), interval_of(replicates_)}; }

 private:
  [[nodiscard]] Value of(const Values& values) const {
    const Value& v = at(values, score_);
    return {v.observed, v.modelled, v.observed > 0 ? v.modelled / v.observed : kNone};
  }
  Score score_;
  std::vector<double> replicates_;
};

std::string sentence_of(const AreaScores& area, const Season& season) {
  const std::string who = fmt::format("{}, mean of {} stations: ", season.name, area.stations);
  if (area.verdict == AreaVerdict::too_small) {
    return who + fmt::format("sample too small: {} years, at least {} needed", area.years, kFewestYears);
  }
  const auto ratio = [](const Estimate& estimate) {
    return std::isnan(estimate.value.value) ? "not to be had" : fmt::format("{:.3g}", estimate.value.value);
  };
  const std::string ratios =
      fmt::format("product over observed is {} for the variance, {} for the 95th percentile and {} for Rx1day",
                  ratio(area.variance), ratio(area.percentile_95), ratio(area.yearly_maximum));
  const std::string range = fmt::format("{:g} to {:g}", kLeastAreaRatio, kLargestAreaRatio);
  if (area.verdict == AreaVerdict::sound) {
    return who + fmt::format("areal extremes may be used: {}, all within {}", ratios, range);
  }
  return who + fmt::format("do not use areal extremes: {}, not all within {}", ratios, range);
}

}  // namespace

std::vector<CorrelationBin> correlation_by_distance(const Days& days, const Season& season, const Field& observed,
                                                    const Field& modelled, const Distance& distance,
                                                    const std::vector<double>& edges_m, int fewest_days) {
  check(days, observed, modelled);
  std::vector<CorrelationBin> bins;
  for (std::size_t k = 0; k + 1 < edges_m.size(); ++k) bins.push_back({edges_m[k], edges_m[k + 1], 0, 0, 0});
  std::vector<std::size_t> in_season;
  for (std::size_t i = 0; i < days.size(); ++i) {
    if (season.has_month[static_cast<std::size_t>(days.date(i).month - 1)]) in_season.push_back(i);
  }
  for (std::size_t a = 0; a < observed.size(); ++a) {
    for (std::size_t b = a + 1; b < observed.size(); ++b) {
      const double apart = distance(a, b);
      const auto edge = std::upper_bound(edges_m.begin(), edges_m.end(), apart);
      if (edge == edges_m.begin() || edge == edges_m.end()) continue;
      const auto both = correlations(in_season, observed, modelled, a, b, fewest_days);
      if (std::isnan(both[0]) || std::isnan(both[1])) continue;
      CorrelationBin& bin = bins[static_cast<std::size_t>(edge - edges_m.begin()) - 1];
      ++bin.pairs;
      bin.observed += both[0];
      bin.modelled += both[1];
    }
  }
  for (CorrelationBin& bin : bins) {
    bin.observed = bin.pairs > 0 ? bin.observed / bin.pairs : kNone;
    bin.modelled = bin.pairs > 0 ? bin.modelled / bin.pairs : kNone;
  }
  return bins;
}

AreaScores score_area(const Days& days, const Season& season, const Field& observed, const Field& modelled,
                      const std::vector<std::size_t>& group, const Resampling& resampling) {
  check(days, observed, modelled);
  // Without a station the mean is 0/0, missing on every day; one that lacks a day takes the day from all.
  std::vector<double> mean_observed(days.size(), 0), mean_modelled(days.size(), 0);
  const auto n = static_cast<double>(group.size());
  for (std::size_t i = 0; i < days.size(); ++i) {
    for (const std::size_t station : group) {
      mean_observed[i] += observed.at(station)[i];
      mean_modelled[i] += modelled.at(station)[i];
    }
    mean_observed[i] /= n;
    mean_modelled[i] /= n;
  }
  const Sample sample(days, season, {Quantity::precipitation}, mean_observed, mean_modelled);
  Ratio variance(Score::variance_ratio), percentile(Score::percentile_95), maximum(Score::yearly_maximum);
  for (int r = 0; r < resampling.replicates; ++r) {
    const Values values = sample.scores(draw_years(resampling, r, sample.years().size()));
    for (Ratio* ratio : {&variance, &percentile, &maximum}) ratio->add(values);
  }
  const Values values = sample.scores();
  AreaScores out{group.size(),
                 sample.days(),
                 sample.well_sampled_years(),
                 variance.estimate(values),
                 percentile.estimate(values),
                 maximum.estimate(values),
                 AreaVerdict::sound,
                 {}};
  for (const Estimate* estimate : {&out.variance, &out.percentile_95, &out.yearly_maximum}) {
    const double ratio = estimate->value.value;
    if (!(ratio >= kLeastAreaRatio && ratio <= kLargestAreaRatio)) out.verdict = AreaVerdict::refused;
  }
  if (out.years < kFewestYears) out.verdict = AreaVerdict::too_small;
  out.sentence = sentence_of(out, season);
  return out;
}

}  // namespace windrow::scores
