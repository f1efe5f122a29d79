// Seasons as sets of months, and the days of a series as positions in them. No values.
#pragma once
#include <array>
#include <cstdint>
#include <string>
#include <vector>

#include "windrow/calendar/calendar.h"

namespace windrow::scores {

/// A set of months. Where it has both December and January but not the whole year, the months at the year's end that
/// lead into January count with the following year: the winter 2001 is December 2000 to February 2001.
struct Season {
  std::string name;                ///< "January", "DJF", "year"
  std::array<bool, 12> has_month;  ///< from January

  [[nodiscard]] int year_of(int year, int month) const;  ///< the season's year that a month (1..12) belongs to
  [[nodiscard]] int months() const;
};

/// The 12 months, then DJF, MAM, JJA, SON, then the year.
std::vector<Season> standard_seasons();

/// The days of a daily series.
class Days {
 public:
  /// Error(defect) unless the dates exist in the calendar and ascend strictly; gaps are allowed.
  Days(const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates);

  [[nodiscard]] std::size_t size() const { return dates_.size(); }
  [[nodiscard]] const calendar::Date& date(std::size_t i) const { return dates_[i]; }
  [[nodiscard]] bool follows(std::size_t i) const {
    return i > 0 && number_[i] == number_[i - 1] + 1;
  }  ///< day after i-1
  /// Days of the season in one of its years: what a complete series has.
  [[nodiscard]] int length(const Season& season, int year) const;

 private:
  calendar::Calendar calendar_;
  std::vector<calendar::Date> dates_;
  std::vector<std::int64_t> number_;
};

}  // namespace windrow::scores
