// Seasons: which days share a transfer. Positions in the year are compared as whole numbers, never as fractions.
#include "windrow/calendar/seasons.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cstdlib>

#include "integer.h"
#include "windrow/base/error.h"

namespace windrow::calendar {
namespace {

constexpr std::int64_t kYear = 365;  // the year that widths and steps are given in

/// Signed distance of the date's middle from centre `season`, in units of 1/(2 * 365 * days_in_year) of a year, in
/// (-half the year, half the year]: the year is a circle.
struct Distance {
  std::int64_t position, centre_unit, circle;

  Distance(const Calendar& calendar, Date date)
      : position((2 * std::int64_t{calendar.day_of_year(date)} - 1) * kYear),
        centre_unit(calendar.days_in_year(date.year)),
        circle(2 * kYear * centre_unit) {}

  [[nodiscard]] std::int64_t from(int season, int step) const {
    const std::int64_t centre = (2 * std::int64_t{season} * step + 1) * centre_unit;
    const std::int64_t ahead = floor_mod(position - centre, circle);
    return 2 * ahead > circle ? ahead - circle : ahead;
  }
};

}  // namespace

Seasons Seasons::by_month() { return {}; }

Seasons Seasons::by_year() {
  Seasons seasons;
  seasons.kind_ = Kind::year;
  return seasons;
}

Seasons Seasons::moving(int width, int step) {
  if (width < 1 || width > 366) {
    throw Error(Failure::job, "season", fmt::format("a window of {} days; expected 1 to 366 days", width));
  }
  if (step < 1 || step > kYear) {
    throw Error(Failure::job, "day_step", fmt::format("{} days between windows; expected 1 to 365", step));
  }
  Seasons seasons;
  seasons.kind_ = Kind::moving;
  seasons.width_ = width;
  seasons.step_ = step;
  return seasons;
}

int Seasons::count() const {
  switch (kind_) {
    case Kind::month:
      return 12;
    case Kind::year:
      return 1;
    case Kind::moving:
      return (static_cast<int>(kYear) + step_ - 1) / step_;
  }
  throw Error(Failure::defect, "season", "unknown kind");
}

std::string Seasons::name(int season) const {
  static constexpr std::array<const char*, 12> kMonths = {"January",   "February", "March",    "April",
                                                          "May",       "June",     "July",     "August",
                                                          "September", "October",  "November", "December"};
  if (season < 0 || season >= count()) throw Error(Failure::defect, "season", fmt::format("no season {}", season));
  if (kind_ == Kind::month) return kMonths[static_cast<std::size_t>(season)];
  if (kind_ == Kind::year) return "year";
  return fmt::format("window about day {}", season * step_ + 1);
}

int Seasons::evaluation_season(const Calendar& calendar, Date date) const {
  if (kind_ == Kind::month) return date.month - 1;
  if (kind_ == Kind::year) return 0;
  const Distance distance(calendar, date);
  // The nearest centre is one of the two about the day, or the last one across the year's end.
  const int below = static_cast<int>(
      std::max<std::int64_t>(0, floor_div(distance.position - distance.centre_unit, 2 * distance.centre_unit * step_)));
  int best = 0;
  std::int64_t best_distance = distance.circle;
  for (const int season : {0, count() - 1, std::min(below, count() - 1), std::min(below + 1, count() - 1)}) {
    const std::int64_t away = distance.from(season, step_);
    // On a tie the earlier centre, the one the day lies after, wins: (distance > 0).
    if (std::abs(away) < std::abs(best_distance) || (away == -best_distance && away > 0)) {
      best = season;
      best_distance = away;
    }
  }
  return best;
}

void Seasons::fitting_seasons(const Calendar& calendar, Date date, std::vector<int>& out) const {
  out.clear();
  if (kind_ != Kind::moving) {
    out.push_back(evaluation_season(calendar, date));
    return;
  }
  const Distance distance(calendar, date);
  const std::int64_t half = width_ * distance.centre_unit;  // width / 365 / 2 of the circle
  for (int season = 0; season < count(); ++season) {
    const std::int64_t away = distance.from(season, step_);
    if (2 * half >= distance.circle || (away > -half && away <= half)) out.push_back(season);
  }
}

}  // namespace windrow::calendar
