// Comparisons over stations by common draws of years, and their wording.
#include "windrow/scores/verdict.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::scores {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

using Departures = std::array<double, 3>;  // raw, height, adjusted
using Tables = std::array<Values, 3>;

Departures departures(const Tables& tables, Score score) {
  Departures out{};
  for (std::size_t v = 0; v < 3; ++v) out[v] = departure(score, at(tables[v], score).value);
  return out;
}

bool whole(const Departures& d) {
  return std::all_of(d.begin(), d.end(), [](double v) { return std::isfinite(v); });
}

/// Means over the stations in `judged` whose departures exist; NaN without any.
Departures mean_over(const std::vector<Tables>& tables, const std::vector<std::size_t>& judged, Score score) {
  Departures sum{};
  int n = 0;
  for (const std::size_t i : judged) {
    const Departures one = departures(tables[i], score);
    if (!whole(one)) continue;
    ++n;
    for (std::size_t v = 0; v < 3; ++v) sum[v] += one[v];
  }
  for (double& v : sum) v = n > 0 ? v / n : kNone;
  return sum;
}

std::vector<int> union_of_years(std::span<const Versions> stations, const std::vector<std::size_t>& judged) {
  std::vector<int> years;
  for (const std::size_t i : judged) {
    years.insert(years.end(), stations[i].raw.years().begin(), stations[i].raw.years().end());
  }
  std::sort(years.begin(), years.end());
  years.erase(std::unique(years.begin(), years.end()), years.end());
  return years;
}

/// Scores of the three versions with the station's own years taken as often as the draw over `years` says.
Tables drawn_tables(const Versions& station, const std::vector<int>& years, const std::vector<int>& times) {
  std::vector<int> own;
  for (const int year : station.raw.years()) {
    own.push_back(times[static_cast<std::size_t>(std::lower_bound(years.begin(), years.end(), year) - years.begin())]);
  }
  return {station.raw.scores(own), station.height.scores(own), station.adjusted.scores(own)};
}

Verdict verdict_of(const Interval& improvement) {
  if (std::isnan(improvement.low) || std::isnan(improvement.high)) return Verdict::too_small;
  if (improvement.low > 0) return Verdict::helps;
  return improvement.high < 0 ? Verdict::harms : Verdict::no_clear_difference;
}

std::string units_of(Score score, const std::string& units) {
  switch (score) {
    case Score::variance_ratio:
    case Score::wet_day_frequency:
    case Score::perkins:
    case Score::autocorrelation:
      return "";
    case Score::longest_dry_spell:
      return " days";
    default:
      return units.empty() ? "" : " " + units;
  }
}

std::string count(std::size_t n, const std::string& what) { return fmt::format("{} {}{}", n, what, n == 1 ? "" : "s"); }

}  // namespace

Versions make_versions(const Days& days, const Season& season, const Options& options, std::span<const double> observed,
                       std::span<const double> raw, std::span<const double> height, std::span<const double> adjusted) {
  if (raw.size() != observed.size() || height.size() != observed.size() || adjusted.size() != observed.size()) {
    throw Error(Failure::defect, "verdict", "the four series differ in length");
  }
  std::vector<double> common(observed.begin(), observed.end());
  for (std::size_t i = 0; i < common.size(); ++i) {
    if (std::isnan(raw[i]) || std::isnan(height[i]) || std::isnan(adjusted[i])) common[i] = kNone;
  }
  return {Sample(days, season, options, common, raw), Sample(days, season, options, common, height),
          Sample(days, season, options, common, adjusted)};
}

std::string words(Verdict verdict) {
  switch (verdict) {
    case Verdict::helps:
      return "helps";
    case Verdict::harms:
      return "harms";
    case Verdict::too_small:
      return "sample too small";
    default:
      return "no clear difference";
  }
}

std::vector<Comparison> compare(std::span<const Versions> stations, const Resampling& resampling) {
  std::vector<Score> scores;
  for (std::size_t s = 0; s < kScores; ++s) {
    if (!stations.empty() && stations[0].raw.has(static_cast<Score>(s))) scores.push_back(static_cast<Score>(s));
  }
  std::vector<std::size_t> judged;
  std::vector<Tables> tables(stations.size());
  for (std::size_t i = 0; i < stations.size(); ++i) {
    if (stations[i].raw.well_sampled_years() < kFewestYears) continue;
    judged.push_back(i);
    tables[i] = {stations[i].raw.scores(), stations[i].height.scores(), stations[i].adjusted.scores()};
  }
  const std::vector<int> years = union_of_years(stations, judged);
  std::vector<std::vector<std::size_t>> with_score;
  std::vector<Comparison> out;
  for (const Score score : scores) {
    std::vector<std::size_t> with;
    for (const std::size_t i : judged) {
      if (whole(departures(tables[i], score))) with.push_back(i);
    }
    const Departures mean = mean_over(tables, with, score);
    out.push_back({score,
                   with.size(),
                   stations.size() - with.size(),
                   years.size(),
                   mean[0],
                   mean[1],
                   mean[2],
                   mean[0] - mean[2],
                   mean[1] - mean[2],
                   {},
                   {},
                   Verdict::too_small});
    with_score.push_back(std::move(with));
  }
  std::vector<std::vector<double>> over_raw(scores.size()), over_height(scores.size());
  for (int r = 0; r < resampling.replicates; ++r) {
    const std::vector<int> times = draw_years(resampling, r, years.size());
    for (const std::size_t i : judged) tables[i] = drawn_tables(stations[i], years, times);
    for (std::size_t s = 0; s < scores.size(); ++s) {
      const Departures mean = mean_over(tables, with_score[s], scores[s]);
      over_raw[s].push_back(mean[0] - mean[2]);
      over_height[s].push_back(mean[1] - mean[2]);
    }
  }
  for (std::size_t s = 0; s < scores.size(); ++s) {
    out[s].over_raw_interval = interval_of(std::move(over_raw[s]));
    out[s].over_height_interval = interval_of(std::move(over_height[s]));
    out[s].verdict = verdict_of(out[s].over_height_interval);
  }
  return out;
}

std::vector<Score> main_scores(Quantity quantity) {
  if (quantity == Quantity::temperature) return {Score::bias, Score::perkins};
  return {Score::bias, Score::wet_day_frequency, Score::perkins};
}

Verdict overall(std::span<const Comparison> comparisons, Quantity quantity) {
  const std::vector<Score> scores = main_scores(quantity);
  const auto any = [&comparisons, &scores](Verdict verdict) {
    return std::any_of(comparisons.begin(), comparisons.end(), [&scores, verdict](const Comparison& c) {
      return c.verdict == verdict && std::find(scores.begin(), scores.end(), c.score) != scores.end();
    });
  };
  for (const Verdict verdict : {Verdict::harms, Verdict::helps, Verdict::no_clear_difference}) {
    if (any(verdict)) return verdict;
  }
  return Verdict::too_small;
}

std::string sentence(const Comparison& comparison, const std::string& field, const Season& season,
                     const std::string& units) {
  const std::string what = fmt::format("{}, {}, {}: ", field, season.name, name(comparison.score));
  if (comparison.verdict == Verdict::too_small) {
    return what + fmt::format("sample too small: {} with at least {} years, {} left out",
                              count(comparison.stations, "station"), kFewestYears, comparison.left_out);
  }
  const std::string unit = units_of(comparison.score, units);
  const std::string judged = comparison.verdict == Verdict::no_clear_difference
                                 ? "no clear difference"
                                 : "the adjustment " + words(comparison.verdict);
  const std::string off = comparison.score == Score::variance_ratio ? "off 1 (as logarithm)" : "off";
  return what + fmt::format(
                    "{}: {:.3g}{} {} instead of {:.3g}{} with height adjustment alone ({:.3g}{} raw); improvement "
                    "{:.3g}{}, 90 % interval {:.3g} to {:.3g}{}; {}, {}",
                    judged, comparison.adjusted, unit, off, comparison.height, unit, comparison.raw, unit,
                    comparison.over_height, unit, comparison.over_height_interval.low,
                    comparison.over_height_interval.high, unit, count(comparison.stations, "station"),
                    count(comparison.years, "year"));
}

std::string overall_sentence(std::span<const Comparison> comparisons, const std::string& field, const Season& season,
                             const Options& options) {
  const Verdict verdict = overall(comparisons, options.quantity);
  const std::string what = fmt::format("{}, {}: ", field, season.name);
  if (verdict == Verdict::too_small) {
    return what + fmt::format("sample too small: no station has {} years", kFewestYears);
  }
  std::string by;
  for (const Score score : main_scores(options.quantity)) {
    for (const Comparison& c : comparisons) {
      if (c.score == score) by += fmt::format("{}{} {}", by.empty() ? "" : ", ", name(score), words(c.verdict));
    }
  }
  const std::string judged = verdict == Verdict::no_clear_difference
                                 ? "no clear difference from height adjustment alone"
                             : verdict == Verdict::helps ? "the adjustment helps beyond height adjustment alone"
                                                         : "the adjustment harms: height adjustment alone is better";
  const std::string claim =
      options.paired ? "" : "; distributions only: the model's days are not the observed ones, no skill is claimed";
  return what + fmt::format("{} ({}){}", judged, by, claim);
}

}  // namespace windrow::scores
