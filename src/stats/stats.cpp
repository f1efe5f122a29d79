// Quantiles, means and monotone regression of plain samples. No missing values: callers leave them out.
#include "windrow/stats/stats.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::stats {
namespace {

/// floor(position), where a position less than 4 rounding errors below a whole number counts as that number: 100 * 0.07
/// is 7.000000000000001 in binary, 7 in the sample.
struct Position {
  double whole, rest;

  explicit Position(double position) {
    const double tolerance = 4 * std::numeric_limits<double>::epsilon() * std::max(1.0, std::fabs(position));
    whole = std::floor(position + tolerance);
    rest = position - whole;
    if (std::fabs(rest) <= tolerance) rest = 0;
  }
};

/// Element k (1-based) of the sample, its ends beyond.
template <class Element>
double element(std::size_t size, const Element& ascending, double k) {
  return ascending(static_cast<std::size_t>(std::clamp(k, 1.0, static_cast<double>(size))) - 1);
}

/// Types 1 to 3, Hyndman & Fan 1996, Definitions 1-3.
template <class Element>
double discontinuous(std::size_t size, const Element& ascending, double p, int type) {
  const double n = static_cast<double>(size);
  const Position at(type == 3 ? n * p - 0.5 : n * p);
  const double low = element(size, ascending, at.whole), high = element(size, ascending, at.whole + 1);
  if (at.rest > 0) return high;
  if (type == 1) return low;
  if (type == 2) return low + (high - low) / 2;
  return std::fmod(at.whole, 2.0) == 0 ? low : high;
}

/// Sum by halves down to blocks of 16: the same order whatever machine or thread count.
double pairwise_sum(std::span<const double> values) {
  constexpr std::size_t kBlock = 16;
  if (values.size() > kBlock) {
    const std::size_t half = values.size() / 2;
    return pairwise_sum(values.first(half)) + pairwise_sum(values.subspan(half));
  }
  double sum = 0;
  for (const double value : values) sum += value;
  return sum;
}

/// Departures from the mean; exactly zero for values all alike, whose mean may be off by a rounding error.
std::vector<double> departures(std::span<const double> values) {
  const double first = values.empty() ? 0 : values[0];
  const bool alike = std::all_of(values.begin(), values.end(), [first](double v) { return v == first; });
  const double centre = alike ? first : mean(values);
  std::vector<double> apart(values.begin(), values.end());
  for (double& v : apart) v -= centre;
  return apart;
}

double product_sum(std::span<const double> a, std::span<const double> b) {
  std::vector<double> products(a.begin(), a.end());
  for (std::size_t i = 0; i < products.size(); ++i) products[i] *= b[i];
  return pairwise_sum(products);
}

template <class Element>
double quantile_of(std::size_t size, const Element& ascending, double p, int type) {
  if (type < 1 || type > 9) throw Error(Failure::defect, "quantile", fmt::format("no type {}; expected 1 to 9", type));
  if (size == 0 || std::isnan(p)) return std::numeric_limits<double>::quiet_NaN();
  p = std::clamp(p, 0.0, 1.0);
  if (type <= 3) return discontinuous(size, ascending, p, type);
  struct Plotting {
    double alpha, beta;
  };
  constexpr std::array<Plotting, 6> kTypes = {
      {{0, 1}, {0.5, 0.5}, {0, 0}, {1, 1}, {1.0 / 3, 1.0 / 3}, {3.0 / 8, 3.0 / 8}}};
  const auto [alpha, beta] = kTypes[static_cast<std::size_t>(type - 4)];
  const Position at(alpha + p * (static_cast<double>(size) + 1 - alpha - beta));
  const double low = element(size, ascending, at.whole), high = element(size, ascending, at.whole + 1);
  // The bound keeps the interpolated value in its interval when the last bit rounds up.
  return low == high ? low : std::min(high, low + at.rest * (high - low));
}

}  // namespace

double quantile(std::span<const double> ascending, double p, int type) {
  return quantile_of(
      ascending.size(), [ascending](std::size_t k) { return ascending[k]; }, p, type);
}

double quantile(std::size_t size, const std::function<double(std::size_t)>& ascending, double p, int type) {
  return quantile_of(size, ascending, p, type);
}

int make_non_decreasing(std::span<double> values) {
  struct Block {
    double sum;
    std::size_t count;
    [[nodiscard]] double mean() const { return sum / static_cast<double>(count); }
  };
  std::vector<Block> blocks;
  for (const double value : values) {
    Block block{value, 1};
    while (!blocks.empty() && blocks.back().mean() > block.mean()) {
      block.sum += blocks.back().sum;
      block.count += blocks.back().count;
      blocks.pop_back();
    }
    blocks.push_back(block);
  }
  int moved = 0;
  std::size_t at = 0;
  for (const Block& block : blocks) {
    const double mean = block.mean();
    for (std::size_t i = 0; i < block.count; ++i, ++at) {
      moved += values[at] != mean;
      values[at] = mean;
    }
  }
  return moved;
}

double mean(std::span<const double> values) {
  if (values.empty()) return std::numeric_limits<double>::quiet_NaN();
  return pairwise_sum(values) / static_cast<double>(values.size());
}

double variance(std::span<const double> values) {
  if (values.size() < 2) return std::numeric_limits<double>::quiet_NaN();
  const std::vector<double> apart = departures(values);
  return product_sum(apart, apart) / static_cast<double>(values.size() - 1);
}

double standard_deviation(std::span<const double> values) { return std::sqrt(variance(values)); }

double correlation(std::span<const double> a, std::span<const double> b) {
  if (a.size() != b.size()) {
    throw Error(Failure::defect, "correlation", fmt::format("samples of {} and {} values", a.size(), b.size()));
  }
  if (a.size() < 2) return std::numeric_limits<double>::quiet_NaN();
  const std::vector<double> apart_a = departures(a), apart_b = departures(b);
  const double squares_a = product_sum(apart_a, apart_a), squares_b = product_sum(apart_b, apart_b);
  if (!(squares_a > 0 && squares_b > 0)) return std::numeric_limits<double>::quiet_NaN();
  return std::clamp(product_sum(apart_a, apart_b) / (std::sqrt(squares_a) * std::sqrt(squares_b)), -1.0, 1.0);
}

}  // namespace windrow::stats
