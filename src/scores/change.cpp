// Changes between two periods, before and after the adjustment.
#include "windrow/scores/change.h"

#include <cmath>
#include <limits>
#include <vector>

namespace windrow::scores {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

/// The days of one period; the model stands where the observation stands in a score.
Sample sample_of(const Days& days, const Season& season, std::span<const double> modelled,
                 std::span<const double> product, Period period) {
  std::vector<double> inside(modelled.begin(), modelled.end());
  for (std::size_t i = 0; i < inside.size() && i < days.size(); ++i) {
    const int year = season.year_of(days.date(i).year, days.date(i).month);
    if (year < period.first || year > period.last) inside[i] = kNone;
  }
  return Sample(days, season, Options{}, inside, product);
}

struct Pair {
  double modelled, product;
};

Pair changes(const Values& early, const Values& late, ChangeKind kind) {
  const Value& before = at(early, Score::bias);
  const Value& after = at(late, Score::bias);
  if (kind == ChangeKind::difference) return {after.observed - before.observed, after.modelled - before.modelled};
  const auto ratio = [](double a, double b) { return b > 0 ? a / b : kNone; };
  return {ratio(after.observed, before.observed), ratio(after.modelled, before.modelled)};
}

}  // namespace

Change change_between(const Days& days, const Season& season, std::span<const double> modelled,
                      std::span<const double> product, Period early, Period late, ChangeKind kind,
                      const Resampling& resampling) {
  const Sample before = sample_of(days, season, modelled, product, early);
  const Sample after = sample_of(days, season, modelled, product, late);
  std::vector<double> added;
  for (int r = 0; r < resampling.replicates; ++r) {
    const Pair drawn =
        changes(before.scores(draw_years(resampling, r, before.years().size())),
                after.scores(draw_years(resampling, resampling.replicates + r, after.years().size())), kind);
    added.push_back(drawn.product - drawn.modelled);
  }
  const Pair whole = changes(before.scores(), after.scores(), kind);
  Change out{};
  out.modelled = whole.modelled;
  out.product = whole.product;
  out.added = whole.product - whole.modelled;
  out.added_interval = interval_of(std::move(added));
  out.early_years = before.well_sampled_years();
  out.late_years = after.well_sampled_years();
  out.too_small = out.early_years < kFewestYears || out.late_years < kFewestYears;
  out.kept = out.added_interval.low <= 0 && out.added_interval.high >= 0;
  return out;
}

}  // namespace windrow::scores
