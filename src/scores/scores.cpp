// Sums of a season's years, and scores from them. Resampling takes years several times or not at all, so every score is
// made of sums, counts or sorted values that know their year.
#include "windrow/scores/scores.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>

#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

namespace windrow::scores {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
constexpr std::array<double, 4> kProbabilities = {0.05, 0.5, 0.95, 0.99};

/// Values of a series whose counts by year are kept together.
constexpr std::size_t kQuantileBlock = 64;

Value difference(double observed, double modelled) { return {observed, modelled, modelled - observed}; }

Value& at(Values& values, Score score) { return values[static_cast<std::size_t>(score)]; }

/// Sum of squared departures from the mean of n values, from their sum and squares about another centre; what n
/// rounding errors of the squares can make up is none.
double squared_departures(double n, double sum, double squares) {
  const double apart = squares - sum * sum / n;
  return apart > n * std::numeric_limits<double>::epsilon() * squares ? apart : 0;
}

}  // namespace

std::string name(Score score) {
  constexpr std::array<const char*, kScores> kNames = {"bias",
                                                       "mean absolute error",
                                                       "root mean square error",
                                                       "variance ratio",
                                                       "5th percentile",
                                                       "median",
                                                       "95th percentile",
                                                       "99th percentile",
                                                       "wet-day frequency",
                                                       "Perkins skill score",
                                                       "autocorrelation",
                                                       "longest dry spell",
                                                       "mean of yearly maxima",
                                                       "mean of yearly minima"};
  return kNames[static_cast<std::size_t>(score)];
}

double perfect(Score score) { return score == Score::variance_ratio || score == Score::perkins ? 1 : 0; }

double departure(Score score, double value) {
  if (score == Score::variance_ratio) return std::fabs(std::log(value));
  return std::fabs(value - perfect(score));
}

Sample::Sample(const Days& days, const Season& season, const Options& options, std::span<const double> observed,
               std::span<const double> modelled)
    : options_(options) {
  if (observed.size() != days.size() || modelled.size() != days.size()) {
    throw Error(
        Failure::defect, "scores",
        fmt::format("{} days, {} observed and {} modelled values", days.size(), observed.size(), modelled.size()));
  }
  std::vector<std::size_t> taken;
  for (std::size_t i = 0; i < days.size(); ++i) {
    const calendar::Date& date = days.date(i);
    if (!season.has_month[static_cast<std::size_t>(date.month - 1)]) continue;
    if (std::isnan(observed[i]) || std::isnan(modelled[i])) continue;
    const int year = season.year_of(date.year, date.month);
    if (years_.empty() || years_.back() != year) {
      years_.push_back(year);
      common_.emplace_back();
    }
    taken.push_back(i);
    year_of_taken_.push_back(years_.size() - 1);
    Common& common = common_.back();
    const double error = modelled[i] - observed[i];
    ++common.days;
    common.errors += error;
    common.absolute += std::fabs(error);
    common.squares += error * error;
    const std::size_t n = taken.size();
    common.pairs += n > 1 && taken[n - 2] == i - 1 && days.follows(i) && year_of_taken_[n - 2] == years_.size() - 1;
  }
  const int may_miss = std::min(15, 3 * season.months());
  for (std::size_t y = 0; y < years_.size(); ++y) {
    const int length = days.length(season, years_[y]);
    common_[y].complete = common_[y].days >= length - may_miss;
    well_sampled_ += 2 * common_[y].days >= length;
  }
  add_up(observed_, days, taken, observed);
  add_up(modelled_, days, taken, modelled);
  make_bins();
}

void Sample::add_up(Series& series, const Days& days, const std::vector<std::size_t>& taken,
                    std::span<const double> values) {
  std::vector<std::size_t> order(taken.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(),
                   [&](std::size_t a, std::size_t b) { return values[taken[a]] < values[taken[b]]; });
  for (const std::size_t k : order) {
    series.value.push_back(values[taken[k]]);
    series.year.push_back(year_of_taken_[k]);
  }
  std::vector<std::uint32_t> passed(years_.size(), 0);
  for (std::size_t k = 0; k < series.year.size(); ++k) {
    if (k % kQuantileBlock == 0) series.before.insert(series.before.end(), passed.begin(), passed.end());
    ++passed[series.year[k]];
  }
  series.before.insert(series.before.end(), passed.begin(), passed.end());
  // The median as centre: exact, so that a constant series has no variance at all.
  if (!series.value.empty()) series.centre = series.value[series.value.size() / 2];
  series.sums.resize(years_.size());
  int spell = 0;
  for (std::size_t k = 0; k < taken.size(); ++k) {
    const std::size_t i = taken[k];
    const bool first = k == 0 || year_of_taken_[k - 1] != year_of_taken_[k];
    Year& year = series.sums[year_of_taken_[k]];
    const double value = values[i], apart = value - series.centre;
    year.highest = first ? value : std::max(year.highest, value);
    year.lowest = first ? value : std::min(year.lowest, value);
    year.sum += apart;
    year.squares += apart * apart;
    const bool next = !first && taken[k - 1] == i - 1 && days.follows(i);
    if (next) {
      const double before = values[i - 1] - series.centre;
      year.before += before;
      year.after += apart;
      year.before_squares += before * before;
      year.after_squares += apart * apart;
      year.products += before * apart;
    }
    const bool wet = value >= options_.wet_day;
    year.wet += wet;
    spell = wet ? 0 : (next ? spell + 1 : 1);
    year.spell = std::max(year.spell, spell);
  }
}

void Sample::make_bins() {
  const auto bin_of = [width = options_.bin_width()](double value) { return std::floor(value / width); };
  // Only bins that hold something are kept, so that one absurd value costs no memory.
  std::vector<double> bins;
  for (const Series* series : {&observed_, &modelled_}) {
    for (const double value : series->value) bins.push_back(bin_of(value));
  }
  std::sort(bins.begin(), bins.end());
  bins.erase(std::unique(bins.begin(), bins.end()), bins.end());
  for (Series* series : {&observed_, &modelled_}) {
    series->bins.assign(bins.size() * years_.size(), 0);
    for (std::size_t k = 0; k < series->value.size(); ++k) {
      const auto bin = std::lower_bound(bins.begin(), bins.end(), bin_of(series->value[k])) - bins.begin();
      ++series->bins[static_cast<std::size_t>(bin) * years_.size() + series->year[k]];
    }
  }
}

bool Sample::has(Score score) const {
  switch (score) {
    case Score::mean_absolute_error:
    case Score::root_mean_square_error:
      return options_.paired;
    case Score::wet_day_frequency:
    case Score::longest_dry_spell:
      return options_.quantity == Quantity::precipitation;
    case Score::yearly_minimum:
      return options_.quantity == Quantity::temperature;
    default:
      return true;
  }
}

Values Sample::scores() const { return scores(std::vector<int>(years_.size(), 1)); }

Values Sample::scores(std::span<const int> times) const {
  if (times.size() != years_.size()) {
    throw Error(Failure::defect, "scores", fmt::format("{} counts for {} years", times.size(), years_.size()));
  }
  Values out;
  out.fill({kNone, kNone, kNone});
  std::int64_t days = 0;
  for (std::size_t y = 0; y < times.size(); ++y) days += std::int64_t{times[y]} * common_[y].days;
  if (days == 0) return out;
  mean_and_spread(times, out);
  std::array<double, 4> observed{}, modelled{};
  quantiles(observed_, times, observed);
  quantiles(modelled_, times, modelled);
  for (std::size_t p = 0; p < observed.size(); ++p) {
    out[static_cast<std::size_t>(Score::percentile_5) + p] = difference(observed[p], modelled[p]);
  }
  frequencies(times, out);
  at(out, Score::autocorrelation) = difference(autocorrelation(observed_, times), autocorrelation(modelled_, times));
  over_years(times, out);
  return out;
}

void Sample::mean_and_spread(std::span<const int> times, Values& out) const {
  double n = 0, errors = 0, absolute = 0, squares = 0;
  std::array<double, 2> sum{}, square{};
  for (std::size_t y = 0; y < times.size(); ++y) {
    const double weight = times[y];
    n += weight * common_[y].days;
    errors += weight * common_[y].errors;
    absolute += weight * common_[y].absolute;
    squares += weight * common_[y].squares;
    for (std::size_t s = 0; s < 2; ++s) {
      const Year& year = (s == 0 ? observed_ : modelled_).sums[y];
      sum[s] += weight * year.sum;
      square[s] += weight * year.squares;
    }
  }
  at(out, Score::bias) = {observed_.centre + sum[0] / n, modelled_.centre + sum[1] / n, errors / n};
  if (options_.paired) {
    at(out, Score::mean_absolute_error).value = absolute / n;
    at(out, Score::root_mean_square_error).value = std::sqrt(squares / n);
  }
  if (n < 2) return;
  const double observed = squared_departures(n, sum[0], square[0]) / (n - 1);
  const double modelled = squared_departures(n, sum[1], square[1]) / (n - 1);
  at(out, Score::variance_ratio) = {observed, modelled, observed > 0 ? modelled / observed : kNone};
}

/// Of the drawn values, which are not laid out: the block that holds the k-th is found by halves from the counts before
/// each block, and the value by counting within it.
void Sample::quantiles(const Series& series, std::span<const int> times, std::array<double, 4>& out) const {
  const std::size_t years = times.size(), blocks = series.before.size() / years;
  const auto drawn_before = [&](std::size_t block) {
    std::size_t sum = 0;
    for (std::size_t y = 0; y < years; ++y) {
      sum += static_cast<std::size_t>(times[y]) * series.before[block * years + y];
    }
    return sum;
  };
  const auto drawn_value = [&](std::size_t k) {
    std::size_t block = 0, end = blocks - 1;  // the last entry counts all values
    while (end - block > 1) {
      const std::size_t middle = (block + end) / 2;
      (drawn_before(middle) <= k ? block : end) = middle;
    }
    std::size_t at = block * kQuantileBlock, passed = drawn_before(block);
    while (passed + static_cast<std::size_t>(times[series.year[at]]) <= k) {
      passed += static_cast<std::size_t>(times[series.year[at++]]);
    }
    return series.value[at];
  };
  const std::size_t size = drawn_before(blocks - 1);
  for (std::size_t p = 0; p < out.size(); ++p) out[p] = stats::quantile(size, drawn_value, kProbabilities[p], 7);
}

void Sample::frequencies(std::span<const int> times, Values& out) const {
  std::int64_t days = 0, wet_observed = 0, wet_modelled = 0, shared = 0;
  for (std::size_t y = 0; y < times.size(); ++y) {
    days += std::int64_t{times[y]} * common_[y].days;
    wet_observed += std::int64_t{times[y]} * observed_.sums[y].wet;
    wet_modelled += std::int64_t{times[y]} * modelled_.sums[y].wet;
  }
  for (std::size_t start = 0; start < observed_.bins.size(); start += times.size()) {
    std::int64_t observed = 0, modelled = 0;
    for (std::size_t y = 0; y < times.size(); ++y) {
      observed += std::int64_t{times[y]} * observed_.bins[start + y];
      modelled += std::int64_t{times[y]} * modelled_.bins[start + y];
    }
    shared += std::min(observed, modelled);
  }
  const auto n = static_cast<double>(days);
  at(out, Score::perkins).value = static_cast<double>(shared) / n;
  if (!has(Score::wet_day_frequency)) return;
  at(out, Score::wet_day_frequency) =
      difference(static_cast<double>(wet_observed) / n, static_cast<double>(wet_modelled) / n);
}

double Sample::autocorrelation(const Series& series, std::span<const int> times) const {
  double n = 0, before = 0, after = 0, before_squares = 0, after_squares = 0, products = 0;
  for (std::size_t y = 0; y < times.size(); ++y) {
    const double weight = times[y];
    const Year& year = series.sums[y];
    n += weight * common_[y].pairs;
    before += weight * year.before;
    after += weight * year.after;
    before_squares += weight * year.before_squares;
    after_squares += weight * year.after_squares;
    products += weight * year.products;
  }
  if (n < 2) return kNone;
  const double spread =
      std::sqrt(squared_departures(n, before, before_squares)) * std::sqrt(squared_departures(n, after, after_squares));
  return spread > 0 ? std::clamp((products - before * after / n) / spread, -1.0, 1.0) : kNone;
}

void Sample::over_years(std::span<const int> times, Values& out) const {
  double n = 0;
  std::array<double, 2> highest{}, lowest{}, spell{};
  for (std::size_t y = 0; y < times.size(); ++y) {
    if (!common_[y].complete) continue;
    const double weight = times[y];
    n += weight;
    for (std::size_t s = 0; s < 2; ++s) {
      const Year& year = (s == 0 ? observed_ : modelled_).sums[y];
      highest[s] += weight * year.highest;
      lowest[s] += weight * year.lowest;
      spell[s] += weight * year.spell;
    }
  }
  if (n == 0) return;
  at(out, Score::yearly_maximum) = difference(highest[0] / n, highest[1] / n);
  if (has(Score::yearly_minimum)) at(out, Score::yearly_minimum) = difference(lowest[0] / n, lowest[1] / n);
  if (has(Score::longest_dry_spell)) at(out, Score::longest_dry_spell) = difference(spell[0] / n, spell[1] / n);
}

}  // namespace windrow::scores
