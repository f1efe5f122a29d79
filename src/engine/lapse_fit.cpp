#include "lapse_fit.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

constexpr std::size_t kFewestStations = 5;
constexpr double kLeastSpan_m = 300;

using Months = std::array<double, 12>;

Months observed_means(const station::Record& record) {
  Months sum{}, count{};
  for (const auto& value : record.monthly) {
    sum[static_cast<std::size_t>(value.month - 1)] += value.value;
    count[static_cast<std::size_t>(value.month - 1)] += 1;
  }
  for (std::size_t m = 0; m < 12; ++m) {
    const double normal = record.normal.empty() ? std::numeric_limits<double>::quiet_NaN() : record.normal[m];
    sum[m] = count[m] > 0 ? sum[m] / count[m] : normal;
  }
  return sum;
}

Months model_means(const std::vector<double>& series, const adjust::Steps& steps) {
  Months sum{}, count{};
  for (std::size_t t = 0; t < series.size(); ++t) {
    if (!(series[t] == series[t])) continue;
    sum[steps.month[t]] += series[t];
    count[steps.month[t]] += 1;
  }
  for (std::size_t m = 0; m < 12; ++m) sum[m] /= count[m];
  return sum;
}

struct Line {
  double slope = 0, low = 0, high = 0;
  std::size_t points = 0;
};

Line least_squares(const std::vector<std::pair<double, double>>& points) {
  Line out;
  out.points = points.size();
  if (points.empty()) return out;
  double x_mean = 0, y_mean = 0, xx = 0, xy = 0;
  for (const auto& [x, y] : points) {
    x_mean += x / static_cast<double>(points.size());
    y_mean += y / static_cast<double>(points.size());
  }
  out.low = out.high = points.front().first;
  for (const auto& [x, y] : points) {
    xx += (x - x_mean) * (x - x_mean);
    xy += (x - x_mean) * (y - y_mean);
    out.low = std::min(out.low, x);
    out.high = std::max(out.high, x);
  }
  out.slope = xx > 0 ? xy / xx : 0;
  return out;
}

}  // namespace

std::array<double, 12> fit_lapse(const std::vector<Placed>& placed, const std::vector<std::vector<double>>& series,
                                 const adjust::Steps& steps, const std::string& place, Notices& notices) {
  std::array<std::vector<std::pair<double, double>>, 12> points;
  for (std::size_t i = 0; i < placed.size(); ++i) {
    const Months observed = observed_means(*placed[i].record), modelled = model_means(series[i], steps);
    const double height = placed[i].record->site.elevation_m - placed[i].model_height;
    for (std::size_t m = 0; m < 12; ++m) {
      const double difference = observed[m] - modelled[m];
      if (difference == difference) points[m].emplace_back(height, difference);
    }
  }
  std::array<double, 12> out{};
  double sum = 0;
  for (std::size_t m = 0; m < 12; ++m) {
    const Line line = least_squares(points[m]);
    if (line.points < kFewestStations || line.high - line.low < kLeastSpan_m) {
      throw Error(Failure::data, place,
                  fmt::format("{} stations, {:.0f} m between their heights above the model's, are too few to fit a "
                              "lapse; expected at least {} and {:.0f} m, or a lapse such as \"-6.5 K/km\"",
                              line.points, line.high - line.low, kFewestStations, kLeastSpan_m));
    }
    out[m] = line.slope;
    sum += line.slope;
  }
  const auto [low, high] = std::minmax_element(out.begin(), out.end());
  notices.add(place,
              fmt::format("lapse fitted to {} stations: {:.2f} per km in the mean of the months ({:.2f} to {:.2f})",
                          placed.size(), sum / 12 * 1000, *low * 1000, *high * 1000));
  return out;
}

}  // namespace windrow::engine
