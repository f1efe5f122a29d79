// Seasons: the groups of days that share one transfer. A day is *evaluated* with exactly one season and may belong to
// the *fitting sample* of several (moving windows overlap). science.md's rules: windows about each day of the year as a
// fraction of the year, in every calendar, stepped by day_step.
#pragma once
#include <string>
#include <vector>

#include "windrow/calendar/calendar.h"

namespace windrow::calendar {

class Seasons {
 public:
  static Seasons by_month();
  static Seasons by_year();
  /// Windows of `width` days centred every `step` days of a 365-day year, from its first day: ceil(365/step) centres.
  /// A day belongs to a window when its year fraction lies in (centre - width/730, centre + width/730], round the
  /// year's end: exactly `width` days of a 365-day year (symmetric for odd widths), in proportion in others. Decided in
  /// whole numbers. Error(job) unless 1 <= width <= 366 and 1 <= step <= 365.
  static Seasons moving(int width, int step);

  [[nodiscard]] int count() const;
  [[nodiscard]] bool is_month() const { return kind_ == Kind::month; }
  [[nodiscard]] bool is_moving() const { return kind_ == Kind::moving; }
  [[nodiscard]] std::string name(int season) const;  ///< "January", "window about day 15", "year"
  /// The season a day is evaluated with (moving: the nearest centre, the earlier one on a tie). With step <= width the
  /// day is in that season's fitting sample.
  [[nodiscard]] int evaluation_season(const Calendar& calendar, Date date) const;
  /// All seasons whose fitting sample contains the day, ascending.
  void fitting_seasons(const Calendar& calendar, Date date, std::vector<int>& out) const;

 private:
  enum class Kind { month, year, moving };
  Kind kind_ = Kind::month;
  int width_ = 0, step_ = 0;
};

}  // namespace windrow::calendar
