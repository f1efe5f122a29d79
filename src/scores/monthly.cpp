// Means of months and their errors over stations.
#include "windrow/scores/monthly.h"

#include <fmt/format.h>

#include <cmath>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::scores {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
constexpr int kMostDaysMissing = 1;

int order(const MonthOfYear& month) { return month.year * 12 + month.month; }

}  // namespace

std::vector<MonthOfYear> month_means(const calendar::Calendar& calendar, std::span<const calendar::Date> dates,
                                     std::span<const double> values, bool daily) {
  if (dates.size() != values.size()) {
    throw Error(Failure::defect, "means of months", fmt::format("{} dates, {} values", dates.size(), values.size()));
  }
  std::vector<MonthOfYear> out;
  for (std::size_t i = 0; i < dates.size();) {
    const int year = dates[i].year, month = dates[i].month;
    double sum = 0;
    int count = 0;
    for (; i < dates.size() && dates[i].year == year && dates[i].month == month; ++i) {
      if (std::isnan(values[i])) continue;
      sum += values[i];
      ++count;
    }
    const int needed = daily ? calendar.days_in_month(year, month) - kMostDaysMissing : 1;
    if (count >= needed) out.push_back({year, month, sum / count});
  }
  return out;
}

MonthMeans common_means(std::span<const MonthOfYear> observed, std::span<const MonthOfYear> modelled) {
  MonthMeans out{};
  std::array<int, 12> count{};
  auto model = modelled.begin();
  for (const MonthOfYear& seen : observed) {
    while (model != modelled.end() && order(*model) < order(seen)) ++model;
    if (model == modelled.end()) break;
    if (order(*model) != order(seen)) continue;
    const auto m = static_cast<std::size_t>(seen.month - 1);
    out.observed[m] += seen.value;
    out.modelled[m] += model->value;
    ++count[m];
  }
  for (std::size_t m = 0; m < 12; ++m) {
    out.observed[m] = count[m] > 0 ? out.observed[m] / count[m] : kNone;
    out.modelled[m] = count[m] > 0 ? out.modelled[m] / count[m] : kNone;
  }
  return out;
}

MonthErrors month_errors(std::span<const MonthMeans> stations) {
  MonthErrors out{};
  int months = 0;
  for (std::size_t m = 0; m < 12; ++m) {
    for (const MonthMeans& station : stations) {
      const double error = station.modelled[m] - station.observed[m];
      if (std::isnan(error)) continue;
      out.mean_absolute[m] += std::fabs(error);
      out.bias[m] += error;
      ++out.stations[m];
    }
    out.mean_absolute[m] = out.stations[m] > 0 ? out.mean_absolute[m] / out.stations[m] : kNone;
    out.bias[m] = out.stations[m] > 0 ? out.bias[m] / out.stations[m] : kNone;
    if (out.stations[m] == 0) continue;
    out.mean_absolute_mean += out.mean_absolute[m];
    out.bias_mean += out.bias[m];
    ++months;
  }
  out.mean_absolute_mean = months > 0 ? out.mean_absolute_mean / months : kNone;
  out.bias_mean = months > 0 ? out.bias_mean / months : kNone;
  return out;
}

}  // namespace windrow::scores
