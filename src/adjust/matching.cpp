// Matching of years and months between a station and the run.
#include "matching.h"

#include <algorithm>
#include <limits>

#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

constexpr double kMissing = std::numeric_limits<double>::quiet_NaN();

bool present(double x) { return x == x; }

Matched empty_match(const Setup& setup) {
  const auto seasons = static_cast<std::size_t>(setup.seasons.count());
  Matched m;
  m.observed.assign(seasons, kMissing);
  m.modelled.assign(seasons, kMissing);
  return m;
}

/// Season means of two climatologies; a season needs all of its months on both sides.
void weigh_months(const Setup& setup, const std::array<double, 12>& observed, const std::array<double, 12>& modelled,
                  Matched& out) {
  const auto weights = month_weights(setup.seasons);
  for (std::size_t s = 0; s < weights.size(); ++s) {
    double o = 0, m = 0, total = 0;
    for (std::size_t k = 0; k < 12; ++k) {
      if (weights[s][k] == 0) continue;  // a missing month outside the season does no harm
      o += weights[s][k] * observed[k];
      m += weights[s][k] * modelled[k];
      total += weights[s][k];
    }
    if (total == 0 || !present(o) || !present(m)) continue;
    out.observed[s] = o / total;
    out.modelled[s] = m / total;
  }
}

/// Observed values by season, ascending later; only days of the months in `use` (all when empty).
std::vector<std::vector<double>> observed_samples(const Setup& setup, const ModelMonths& months,
                                                  const Observed& observed, const std::vector<std::uint8_t>& use) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "stations");
  std::vector<std::vector<double>> samples(static_cast<std::size_t>(setup.seasons.count()));
  std::vector<int> seasons;
  const station::DailySeries& daily = observed.record.daily;
  for (std::size_t i = 0; i < daily.day.size(); ++i) {
    const calendar::Date date = gregorian.date(daily.day[i]);
    const int month = date.month - 1;
    if (!use.empty() && !(months.inside(date.year) && use[months.index(date.year, month)])) continue;
    const double value = daily.value[i] - observed.reduction[static_cast<std::size_t>(month)];
    setup.seasons.fitting_seasons(gregorian, date, seasons);
    for (const int s : seasons) samples[static_cast<std::size_t>(s)].push_back(value);
  }
  return samples;
}

/// Which months both have: marks by ModelMonths::index.
std::vector<std::uint8_t> common_months(const ModelMonths& months, const Observed& observed, int& count) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "stations");
  std::vector<std::uint8_t> use(months.size(), 0);
  count = 0;
  for (const std::int64_t day : observed.record.daily.day) {
    const calendar::Date date = gregorian.date(day);
    if (!months.inside(date.year) || !present(months.mean(date.year, date.month - 1))) continue;
    std::uint8_t& mark = use[months.index(date.year, date.month - 1)];
    count += mark ? 0 : 1;
    mark = 1;
  }
  return use;
}

}  // namespace

std::vector<std::array<double, 12>> month_weights(const calendar::Seasons& seasons) {
  const auto noleap = calendar::Calendar::from_cf("noleap", "seasons");
  std::vector<std::array<double, 12>> weights(static_cast<std::size_t>(seasons.count()));
  for (auto& w : weights) w.fill(0);
  std::vector<int> of_day;
  for (int month = 1; month <= 12; ++month) {
    for (int day = 1; day <= noleap.days_in_month(1, month); ++day) {
      seasons.fitting_seasons(noleap, {1, month, day}, of_day);
      for (const int s : of_day) weights[static_cast<std::size_t>(s)][static_cast<std::size_t>(month - 1)] += 1;
    }
  }
  return weights;
}

ModelMonths::ModelMonths(const Setup& setup, const Steps& steps, std::span<const double> model) {
  if (model.empty()) return;
  const auto [low, high] = std::minmax_element(steps.year.begin(), steps.year.end());
  first_year_ = *low;
  last_year_ = *high;
  const auto size = static_cast<std::size_t>(last_year_ - first_year_ + 1) * 12;
  std::vector<double> sum(size, 0.0);
  std::vector<int> values(size, 0), days(size, 0);
  in_period_.assign(size, 1);
  for (std::size_t t = 0; t < model.size(); ++t) {
    const std::size_t i = index(steps.year[t], steps.month[t]);
    ++days[i];
    if (!steps.in_period[t]) in_period_[i] = 0;
    if (!present(model[t])) continue;
    sum[i] += model[t];
    ++values[i];
  }
  // A run that begins or ends inside a month has that month in part; February's leap day is no such case.
  std::array<int, 12> longest{};
  for (std::size_t i = 0; i < size; ++i) longest[i % 12] = std::max(longest[i % 12], days[i]);
  mean_.assign(size, kMissing);
  for (std::size_t i = 0; i < size; ++i) {
    const bool whole = !setup.daily || days[i] + 1 >= longest[i % 12];
    if (whole && values[i] > 0) mean_[i] = sum[i] / values[i];
  }
}

double ModelMonths::mean(int year, int month) const { return inside(year) ? mean_[index(year, month)] : kMissing; }

template <class Use>
std::array<double, 12> ModelMonths::average(Use use) const {
  std::array<double, 12> sum{};
  std::array<int, 12> count{};
  for (std::size_t i = 0; i < mean_.size(); ++i) {
    if (!present(mean_[i]) || !use(i)) continue;
    sum[i % 12] += mean_[i];
    ++count[i % 12];
  }
  for (std::size_t m = 0; m < 12; ++m) sum[m] = count[m] > 0 ? sum[m] / count[m] : kMissing;
  return sum;
}

std::array<double, 12> ModelMonths::climatology(int first, int last) const {
  return average([&](std::size_t i) {
    const int year = first_year_ + static_cast<int>(i / 12);
    return year >= first && year <= last;
  });
}

std::array<double, 12> ModelMonths::calibration_climatology() const {
  return average([&](std::size_t i) { return in_period_[i] != 0; });
}

int ModelMonths::count(int first, int last) const {
  int n = 0;
  for (std::size_t i = 0; i < mean_.size(); ++i) {
    const int year = first_year_ + static_cast<int>(i / 12);
    n += present(mean_[i]) && year >= first && year <= last ? 1 : 0;
  }
  return n;
}

int ModelMonths::calibration_count() const {
  int n = 0;
  for (std::size_t i = 0; i < mean_.size(); ++i) n += present(mean_[i]) && in_period_[i] ? 1 : 0;
  return n;
}

Matched match_daily(const Setup& setup, const Steps& steps, std::span<const double> model, const ModelMonths& months,
                    const Observed& observed, bool accept_mismatch) {
  Matched out = empty_match(setup);
  std::vector<std::uint8_t> use = common_months(months, observed, out.months);
  if (out.months == 0) {
    if (!accept_mismatch) return out;
    out.whole_period = true;
    out.months = months.calibration_count();
    use.clear();
  }
  auto samples = observed_samples(setup, months, observed, use);
  const bool shaped = setup.width() > 0;
  const StepGroups& groups = out.whole_period ? steps.sample : steps.member;
  std::vector<double> modelled;
  for (std::size_t s = 0; s < samples.size(); ++s) {
    modelled.clear();
    for (std::uint32_t i = groups.start[s]; i < groups.start[s + 1]; ++i) {
      const std::uint32_t t = groups.step[i];
      if (!use.empty() && !use[months.index(steps.year[t], steps.month[t])]) continue;
      if (present(model[t])) modelled.push_back(model[t]);
    }
    if (!samples[s].empty() && !modelled.empty()) {
      out.observed[s] = stats::mean(samples[s]);
      out.modelled[s] = stats::mean(modelled);
    }
    if (!shaped) continue;
    std::sort(samples[s].begin(), samples[s].end());
    std::sort(modelled.begin(), modelled.end());
    out.modelled_sample.push_back(modelled);
  }
  if (shaped) out.observed_sample = std::move(samples);
  return out;
}

Matched match_monthly(const Setup& setup, const ModelMonths& months, const Observed& observed, bool accept_mismatch) {
  Matched out = empty_match(setup);
  const auto weights = month_weights(setup.seasons);
  std::vector<std::array<int, 12>> seen(weights.size());
  std::vector<double> o(weights.size(), 0.0), m(weights.size(), 0.0), total(weights.size(), 0.0);
  std::array<double, 12> all_sum{};
  std::array<int, 12> all_count{};
  for (const station::MonthlyValue& v : observed.record.monthly) {
    const auto k = static_cast<std::size_t>(v.month - 1);
    const double value = v.value - observed.reduction[k];
    all_sum[k] += value;
    ++all_count[k];
    const double model = months.mean(v.year, v.month - 1);
    if (!present(model)) continue;
    ++out.months;
    for (std::size_t s = 0; s < weights.size(); ++s) {
      const double w = weights[s][k];
      if (w == 0) continue;
      o[s] += w * value;
      m[s] += w * model;
      total[s] += w;
      ++seen[s][k];
    }
  }
  if (out.months == 0) {
    if (!accept_mismatch) return out;
    out.whole_period = true;
    out.months = months.calibration_count();
    for (std::size_t k = 0; k < 12; ++k) all_sum[k] = all_count[k] > 0 ? all_sum[k] / all_count[k] : kMissing;
    weigh_months(setup, all_sum, months.calibration_climatology(), out);
    return out;
  }
  for (std::size_t s = 0; s < weights.size(); ++s) {
    bool complete = total[s] > 0;
    for (std::size_t k = 0; k < 12; ++k) complete = complete && (weights[s][k] == 0 || seen[s][k] > 0);
    if (!complete) continue;
    out.observed[s] = o[s] / total[s];
    out.modelled[s] = m[s] / total[s];
  }
  return out;
}

Matched match_normals(const Setup& setup, const ModelMonths& months, const Observed& observed,
                      std::pair<int, int> normals_period) {
  Matched out = empty_match(setup);
  std::array<double, 12> normal{};
  for (std::size_t k = 0; k < 12; ++k) normal[k] = observed.record.normal[k] - observed.reduction[k];
  std::array<double, 12> modelled = months.climatology(normals_period.first, normals_period.second);
  out.months = months.count(normals_period.first, normals_period.second);
  if (!std::all_of(modelled.begin(), modelled.end(), present)) {
    out.whole_period = true;
    modelled = months.calibration_climatology();
    out.months = months.calibration_count();
  }
  weigh_months(setup, normal, modelled, out);
  return out;
}

}  // namespace windrow::adjust
