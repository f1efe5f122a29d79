// Errors of monthly means: what stations without daily series can tell. No intervals: normals have no years to draw.
#pragma once
#include <array>
#include <span>
#include <vector>

#include "windrow/calendar/calendar.h"

namespace windrow::scores {

using Months = std::array<double, 12>;  ///< from January; NaN where there is none

struct MonthOfYear {
  int year, month;  ///< 1..12
  double value;
};

/// Means of the months of a series with one value a date (NaN missing), ascending; a month with more than one day short
/// (`daily`; else without its value) is left out. Error(defect) for series of other lengths.
std::vector<MonthOfYear> month_means(const calendar::Calendar& calendar, std::span<const calendar::Date> dates,
                                     std::span<const double> values, bool daily);

struct MonthMeans {
  Months observed, modelled;
};
/// Means of each calendar month over the months both have (both ascending).
MonthMeans common_means(std::span<const MonthOfYear> observed, std::span<const MonthOfYear> modelled);

struct MonthErrors {
  Months mean_absolute, bias;  ///< over the stations that have both; bias is modelled minus observed
  std::array<int, 12> stations;
  double mean_absolute_mean, bias_mean;  ///< over the months that have a station; NaN without any
};
/// One entry a station.
MonthErrors month_errors(std::span<const MonthMeans> stations);

}  // namespace windrow::scores
