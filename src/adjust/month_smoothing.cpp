// Tables of the monthly-to-daily smoothing. Only + - * /: the tables are the same bits everywhere.
#include "windrow/adjust/month_smoothing.h"

#include <algorithm>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::adjust {
namespace {

/// The slowest part of the change shrinks by 0.4 % a sweep, so this many leave less than rounding (1e-17).
constexpr int kSweeps = 10000;

constexpr std::array<int, 12> kPlainYear = {31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
constexpr std::array<int, 12> kLeapYear = {31, 29, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
constexpr std::array<int, 12> kEvenYear = {30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30};

constexpr double kThird = 1.0 / 3;   // a product is twice as fast; means are restored anyway
using Row = std::array<double, 12>;  // one day's response to a unit value in each month

/// Adds C(K) to the days of each month, so that the month's mean of day values is again the unit vector of the month.
void restore_means(const std::array<int, 12>& lengths, std::vector<Row>& days) {
  std::size_t first = 0;
  for (std::size_t month = 0; month < 12; ++month) {
    const auto length = static_cast<std::size_t>(lengths[month]);
    if (length == 0) continue;
    Row correction{};
    for (std::size_t d = first; d < first + length; ++d) {
      for (std::size_t k = 0; k < 12; ++k) correction[k] += days[d][k];
    }
    for (std::size_t k = 0; k < 12; ++k) {
      correction[k] = (k == month ? 1.0 : 0.0) - correction[k] / static_cast<double>(length);
    }
    for (std::size_t d = first; d < first + length; ++d) {
      for (std::size_t k = 0; k < 12; ++k) days[d][k] += correction[k];
    }
    first += length;
  }
}

std::vector<Row> responses(const std::array<int, 12>& lengths) {
  std::vector<Row> days;
  for (std::size_t month = 0; month < 12; ++month) {
    Row unit{};
    unit[month] = 1;
    days.insert(days.end(), static_cast<std::size_t>(lengths[month]), unit);
  }
  std::vector<Row> smooth(days.size());
  const std::size_t n = days.size();
  for (int sweep = 0; sweep < kSweeps; ++sweep) {
    for (std::size_t d = 0; d < n; ++d) {
      const Row& before = days[d == 0 ? n - 1 : d - 1];
      const Row& after = days[d + 1 == n ? 0 : d + 1];
      for (std::size_t k = 0; k < 12; ++k) smooth[d][k] = (before[k] + days[d][k] + after[k]) * kThird;
    }
    restore_means(lengths, smooth);
    days.swap(smooth);
  }
  return days;
}

std::array<int, 12> lengths_of(const calendar::Calendar& calendar, int year) {
  using Kind = calendar::Calendar::Kind;
  if (calendar.kind() == Kind::day360) return kEvenYear;
  std::array<int, 12> lengths{};
  if (calendar.kind() == Kind::custom) {
    for (int m = 1; m <= 12; ++m) lengths[static_cast<std::size_t>(m - 1)] = calendar.days_in_month(year, m);
    return lengths;
  }
  // By February alone: October 1582 of the standard calendar is short, but its days keep their places.
  return calendar.days_in_month(year, 2) == 29 ? kLeapYear : kPlainYear;
}

}  // namespace

void MonthSmoothing::append(const Lengths& lengths) {
  if (std::find(years_.begin(), years_.end(), lengths) != years_.end()) return;
  const std::vector<Row> days = responses(lengths);
  if (month_.size() + days.size() > static_cast<std::size_t>(std::numeric_limits<std::int16_t>::max())) {
    throw Error(Failure::data, "calendar", "a year of this many days cannot be smoothed from months");
  }
  years_.push_back(lengths);
  first_slot_.push_back(static_cast<int>(month_.size()));
  for (std::size_t month = 0; month < 12; ++month) {
    month_.insert(month_.end(), static_cast<std::size_t>(lengths[month]), static_cast<std::uint8_t>(month));
    for (const Row& day : days) response_[month].push_back(day[month]);
  }
}

std::shared_ptr<const MonthSmoothing> MonthSmoothing::of(const calendar::Calendar& calendar) {
  static const std::shared_ptr<const MonthSmoothing> common = [] {
    auto table = std::make_shared<MonthSmoothing>();
    for (const Lengths& year : {kPlainYear, kLeapYear, kEvenYear}) table->append(year);
    return table;
  }();
  if (calendar.kind() != calendar::Calendar::Kind::custom) return common;
  auto table = std::make_shared<MonthSmoothing>(*common);
  // Leap years of a user-defined calendar recur within four centuries like the Gregorian ones.
  for (int year = 1; year <= 400; ++year) table->append(lengths_of(calendar, year));
  return table;
}

int MonthSmoothing::slot(const calendar::Calendar& calendar, calendar::Date date) const {
  const Lengths lengths = lengths_of(calendar, date.year);
  const auto found = std::find(years_.begin(), years_.end(), lengths);
  if (found == years_.end()) throw Error(Failure::defect, "smoothing of months", "table made for another calendar");
  int slot = first_slot_[static_cast<std::size_t>(found - years_.begin())] + date.day - 1;
  for (int m = 1; m < date.month; ++m) slot += lengths[static_cast<std::size_t>(m - 1)];
  return slot;
}

void MonthSmoothing::spread(std::span<const double> monthly, std::span<double> daily) const {
  std::fill(daily.begin(), daily.end(), 0.0);
  for (std::size_t month = 0; month < 12; ++month) {
    const double value = monthly[month];
    const double* response = response_[month].data();
    for (std::size_t s = 0; s < daily.size(); ++s) daily[s] += value * response[s];
  }
}

}  // namespace windrow::adjust
