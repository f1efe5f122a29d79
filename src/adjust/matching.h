// Station values against model values of the same months: season means and samples. No targets here.
#pragma once
#include <array>
#include <span>
#include <vector>

#include "windrow/adjust/transfer.h"

namespace windrow::adjust {

/// Season means on both sides, NaN where either is missing, and what they rest on.
struct Matched {
  std::vector<double> observed, modelled;  // [season]
  // [season], ascending, the same months on both sides; empty without daily data or where no shape is asked for
  std::vector<std::vector<double>> observed_sample, modelled_sample;
  int months = 0;             // pairs of the run
  bool whole_period = false;  // nothing in common: the calibration period was used
};

/// Days of a 365-day year that belong to each season, by calendar month: [season][month].
std::vector<std::array<double, 12>> month_weights(const calendar::Seasons& seasons);

/// Monthly means of the model series, by year and month.
class ModelMonths {
 public:
  ModelMonths(const Setup& setup, const Steps& steps, std::span<const double> model);
  /// The month's mean; NaN when the run lacks the month, has it only in part, or has no value in it.
  [[nodiscard]] double mean(int year, int month) const;
  /// Means of the calendar months over [first, last] (years), or over the calibration period; NaN without any.
  [[nodiscard]] std::array<double, 12> climatology(int first, int last) const;
  [[nodiscard]] std::array<double, 12> calibration_climatology() const;
  [[nodiscard]] int count(int first, int last) const;
  [[nodiscard]] int calibration_count() const;
  /// Position of a month in the run's span of years, for tables of months.
  [[nodiscard]] bool inside(int year) const { return year >= first_year_ && year <= last_year_; }
  [[nodiscard]] std::size_t index(int year, int month) const {
    return static_cast<std::size_t>(year - first_year_) * 12 + static_cast<std::size_t>(month);
  }
  [[nodiscard]] std::size_t size() const { return mean_.size(); }

 private:
  template <class Use>
  std::array<double, 12> average(Use use) const;
  int first_year_ = 0, last_year_ = -1;
  std::vector<double> mean_;
  std::vector<std::uint8_t> in_period_;
};

struct Observed {
  const station::Record& record;
  std::array<double, 12> reduction;
};

Matched match_daily(const Setup& setup, const Steps& steps, std::span<const double> model, const ModelMonths& months,
                    const Observed& observed, bool accept_mismatch);
Matched match_monthly(const Setup& setup, const ModelMonths& months, const Observed& observed, bool accept_mismatch);
Matched match_normals(const Setup& setup, const ModelMonths& months, const Observed& observed,
                      std::pair<int, int> normals_period);

}  // namespace windrow::adjust
