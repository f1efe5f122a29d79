// From twelve monthly corrections to the days of the year, so that the mean of each month's days stays the correction.
#pragma once
#include <array>
#include <cstdint>
#include <memory>
#include <span>
#include <vector>

#include "windrow/calendar/calendar.h"

namespace windrow::adjust {

/// A linear map from 12 months to the days of a year, tabulated once for each kind of year. Method: Rymes & Myers 2001
/// (Solar Energy 71, 225, 10.1016/S0038-092X(01)00052-4): a three-day mean about the circle of the year, then C(K) =
/// given mean - mean of the smoothed days added to every day of month K, repeated until nothing changes (with the sign
/// + C). Laws: the mean over the days of a month is the month's value to 1e-12 of the largest; a constant stays
/// constant. Slots: the days of a 365-day, a 366-day and a 360-day year one after the other, then those of a
/// user-defined calendar.
class MonthSmoothing {
 public:
  static std::shared_ptr<const MonthSmoothing> of(const calendar::Calendar& calendar);

  [[nodiscard]] std::size_t slots() const { return month_.size(); }
  /// Slot of a date of the calendar the table was made for.
  [[nodiscard]] int slot(const calendar::Calendar& calendar, calendar::Date date) const;
  /// Month 0..11 of every slot.
  [[nodiscard]] std::span<const std::uint8_t> months() const { return month_; }
  /// `monthly`: 12 values; `daily`: slots() values. A month that is NaN makes all days NaN.
  void spread(std::span<const double> monthly, std::span<double> daily) const;

 private:
  using Lengths = std::array<int, 12>;
  void append(const Lengths& lengths);
  std::vector<Lengths> years_;
  std::vector<int> first_slot_;
  std::vector<std::uint8_t> month_;
  std::array<std::vector<double>, 12> response_;  // of each day to a unit value in one month
};

}  // namespace windrow::adjust
