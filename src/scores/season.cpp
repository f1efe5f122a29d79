// Sets of months, and positions of days in them.
#include "windrow/scores/season.h"

#include <fmt/format.h>

#include <algorithm>

#include "windrow/base/error.h"

namespace windrow::scores {

int Season::months() const { return static_cast<int>(std::count(has_month.begin(), has_month.end(), true)); }

int Season::year_of(int year, int month) const {
  if (!has_month[0] || !has_month[11] || months() == 12) return year;
  for (int later = month; later <= 12; ++later) {
    if (!has_month[static_cast<std::size_t>(later - 1)]) return year;
  }
  return year + 1;
}

std::vector<Season> standard_seasons() {
  constexpr std::array<const char*, 12> kMonths = {"January",   "February", "March",    "April",
                                                   "May",       "June",     "July",     "August",
                                                   "September", "October",  "November", "December"};
  std::vector<Season> seasons;
  for (std::size_t month = 0; month < 12; ++month) {
    seasons.push_back({kMonths[month], {}});
    seasons.back().has_month[month] = true;
  }
  constexpr std::array<const char*, 4> kQuarters = {"DJF", "MAM", "JJA", "SON"};
  for (std::size_t quarter = 0; quarter < 4; ++quarter) {
    seasons.push_back({kQuarters[quarter], {}});
    for (std::size_t k = 0; k < 3; ++k) seasons.back().has_month[(11 + 3 * quarter + k) % 12] = true;
  }
  seasons.push_back({"year", {}});
  seasons.back().has_month.fill(true);
  return seasons;
}

Days::Days(const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates)
    : calendar_(calendar), dates_(dates) {
  number_.reserve(dates.size());
  for (const calendar::Date& date : dates) {
    if (!calendar.valid(date)) {
      throw Error(Failure::defect, "days of a series", calendar::to_string(date) + " is no date of the calendar");
    }
    const std::int64_t number = calendar.day_number(date);
    if (!number_.empty() && number <= number_.back()) {
      throw Error(Failure::defect, "days of a series",
                  calendar::to_string(date) + " does not come after the day before it in the series");
    }
    number_.push_back(number);
  }
}

int Days::length(const Season& season, int year) const {
  int days = 0;
  for (int month = 1; month <= 12; ++month) {
    if (!season.has_month[static_cast<std::size_t>(month - 1)]) continue;
    // A month at the year's end that counts with this year lies in the year before.
    days += calendar_.days_in_month(2 * year - season.year_of(year, month), month);
  }
  return days;
}

}  // namespace windrow::scores
