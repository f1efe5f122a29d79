// Arithmetic over the members of an ensemble and over years: statistics, climatologies, warming levels. Knows neither
// files nor meshes; missing values are NaN.
#pragma once
#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "windrow/calendar/calendar.h"

namespace windrow::ensemble {

/// Statistics of one value a member, summed in member order. NaN where any member is missing: what is compared between
/// places and times is always the same set of members. NaN for an empty set.
double mean(std::span<const double> members);
/// Standard deviation with n - 1; NaN for fewer than two members.
double spread(std::span<const double> members);
/// Type 7 of Hyndman & Fan 1996 (Am. Stat. 50:361). Reorders `members`.
double quantile(std::span<double> members, double p);
/// Share of members whose change has the sign of the ensemble mean change, 0..1; a mean of exactly zero agrees with
/// changes of exactly zero.
double agreement(std::span<const double> changes);

/// Means of the twelve months over several years for many cells: within each year's month first, then over years, so
/// that a leap year's February counts as any other.
class MonthlyMeans {
 public:
  MonthlyMeans(std::size_t cells, int years);
  /// Values of one time step, one a cell; steps come in time order. month 1..12.
  void add(int year, int month, std::span<const float> values);
  /// [(month - 1) * cells + cell]. A year's month with a missing step is left out; a month that fewer than 80 % of the
  /// years have is missing (WMO-No. 1203, 2017, section 4.4: normals from at least 24 of 30 years; secondary source).
  [[nodiscard]] std::vector<double> finish();

 private:
  void close_month();

  std::size_t cells_;
  int years_, year_ = 0, month_ = 0, steps_ = 0;
  std::vector<double> current_, sum_;
  std::vector<int> count_;
};

struct Span {
  calendar::Instant time = 0, begin = 0, end = 0;
};
struct YearMean {
  int year = 0;
  double value = 0;
};
/// Annual means of a series, each step weighted by its length. A year with a missing step, or whose steps cover less
/// than 99 % of it, is left out. A step of 300 days or more stands for the year that holds its time.
std::vector<YearMean> annual_means(const calendar::Calendar& calendar, std::span<const Span> steps,
                                   std::span<const double> values);

/// First year to last year, both included.
struct Years {
  int first = 0, last = 0;
  bool operator==(const Years&) const = default;
};
/// Error(data) at `place` where a year of the reference is not among the means.
double reference_mean(std::span<const YearMean> series, Years reference, const std::string& place);

/// The first 20-year running mean that reaches `level` above `reference`: central year n, window n - 9 to n + 10 (IPCC
/// 2021, WGI Atlas, description of warming levels). A window with a year left out is passed over. Nothing where the
/// level is never reached.
struct Crossing {
  int centre = 0;
  Years window;
};
std::optional<Crossing> crossing(std::span<const YearMean> series, double reference, double level);

}  // namespace windrow::ensemble
