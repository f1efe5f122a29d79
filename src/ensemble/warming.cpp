// Global-mean series: annual means and the windows in which a warming level is reached.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "windrow/base/error.h"
#include "windrow/ensemble/ensemble.h"

namespace windrow::ensemble {
namespace {

constexpr calendar::Instant kAnnual = 300 * calendar::kDay;
constexpr double kLeastCovered = 0.99;
constexpr int kBefore = 9, kAfter = 10;

/// Sums of one year.
struct Year {
  double weighted = 0, length = 0;
  bool annual = false;
};

calendar::Instant length_of(const calendar::Calendar& calendar, int year) {
  return calendar::kDay * calendar.days_in_year(year);
}

}  // namespace

std::vector<YearMean> annual_means(const calendar::Calendar& calendar, std::span<const Span> steps,
                                   std::span<const double> values) {
  std::map<int, Year> years;
  for (std::size_t i = 0; i < steps.size(); ++i) {
    const Span& step = steps[i];
    const calendar::Instant middle = step.begin + (step.end - step.begin) / 2;
    const bool annual = step.end - step.begin >= kAnnual;
    const bool inside = step.begin < step.time && step.time < step.end;
    Year& year = years[calendar.date_of(annual && inside ? step.time : middle).year];
    const double length = static_cast<double>(step.end - step.begin);
    year.weighted += values[i] * length;
    year.length += length;
    year.annual = year.annual || annual;
  }
  std::vector<YearMean> out;
  for (const auto& [number, year] : years) {
    const bool whole = year.annual || year.length >= kLeastCovered * static_cast<double>(length_of(calendar, number));
    if (whole && !std::isnan(year.weighted)) out.push_back({number, year.weighted / year.length});
  }
  return out;
}

double reference_mean(std::span<const YearMean> series, Years reference, const std::string& place) {
  double sum = 0;
  int found = 0;
  for (const auto& [year, value] : series) {
    if (year < reference.first || year > reference.last) continue;
    sum += value;
    ++found;
  }
  const int wanted = reference.last - reference.first + 1;
  if (found < wanted) {
    const std::string has = series.empty() ? "no whole year"
                                           : fmt::format("{} of the years {} to {}", series.size(), series.front().year,
                                                         series.back().year);
    throw Error(Failure::data, place,
                fmt::format("the global mean has {} of the {} years of the reference {}-{}; it holds {}", found, wanted,
                            reference.first, reference.last, has));
  }
  return sum / wanted;
}

std::optional<Crossing> crossing(std::span<const YearMean> series, double reference, double level) {
  constexpr std::size_t kLength = kBefore + kAfter + 1;
  for (std::size_t i = 0; i + kLength <= series.size(); ++i) {
    const auto window = series.subspan(i, kLength);
    if (window.back().year - window.front().year != static_cast<int>(kLength) - 1) continue;
    double sum = 0;
    for (const auto& [year, value] : window) sum += value - reference;
    if (sum / static_cast<double>(kLength) >= level) {
      return Crossing{window.front().year + kBefore, {window.front().year, window.back().year}};
    }
  }
  return std::nullopt;
}

}  // namespace windrow::ensemble
