// Gamma fits by Thom's estimator and maximum likelihood; incomplete gamma functions are Boost.Math's.
#include "windrow/stats/gamma.h"

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/special_functions/digamma.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <boost/math/special_functions/log1p.hpp>
#include <boost/math/special_functions/trigamma.hpp>
#include <cmath>
#include <limits>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

namespace windrow::stats {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

struct Slope {
  double value, derivative;
};

/// ln a - psi(a) and its derivative by ln a. From 20 on by the asymptotic series (Abramowitz & Stegun 1964, 6.3.18;
/// from memory): the difference of the two functions loses its digits there, the first term left out is below 3e-16 of
/// it.
Slope log_less_digamma(double a) {
  if (a < 20) {
    return {std::log(a) - boost::math::digamma(a), 1 - a * boost::math::trigamma(a)};
  }
  const double r = 1 / a, q = r * r;
  const double value = r / 2 + q * (1.0 / 12 - q * (1.0 / 120 - q * (1.0 / 252 - q * (1.0 / 240 - q / 132))));
  const double derivative = -(r / 2 + q * (1.0 / 6 - q * (1.0 / 30 - q * (1.0 / 42 - q * (1.0 / 30 - q * 10 / 132)))));
  return {value, derivative};
}

double thom_shape(double excess) { return (1 + std::sqrt(1 + 4 * excess / 3)) / (4 * excess); }

}  // namespace

double log_mean_excess(std::span<const double> positive) {
  for (const double x : positive) {
    if (!(x > 0) || std::isinf(x)) throw Error(Failure::defect, "gamma fit", fmt::format("{} is not positive", x));
  }
  // The mean of values all alike may be off by a rounding error, which would pass for their spread.
  if (std::all_of(positive.begin(), positive.end(), [&](double x) { return x == positive[0]; })) {
    return positive.empty() ? kNone : 0;
  }
  const double centre = mean(positive);
  std::vector<double> excess;
  excess.reserve(positive.size());
  for (const double x : positive) {
    // ln(1 + d) - d, summed to -A because the departures d themselves sum to zero.
    const double d = (x - centre) / centre;
    excess.push_back(std::fabs(d) < 0.5 ? -boost::math::log1pmx(d) : d - std::log(x / centre));
  }
  return mean(excess);
}

Gamma fit_gamma_thom(std::span<const double> positive) {
  const double excess = log_mean_excess(positive);
  if (!(excess > 0)) return {kNone, kNone};
  const double shape = thom_shape(excess);
  return {shape, mean(positive) / shape};
}

Gamma fit_gamma(std::span<const double> positive) {
  const double excess = log_mean_excess(positive);
  if (!(excess > 0)) return {kNone, kNone};
  // ln a - psi(a) falls and is convex in ln a: after the first step Newton's method rises to the root without passing
  // it.
  double log_shape = std::log(thom_shape(excess));
  for (int step = 0; step < 100; ++step) {
    const Slope at = log_less_digamma(std::exp(log_shape));
    const double move = (at.value - excess) / at.derivative;
    log_shape -= move;
    if (std::fabs(move) <= 4 * std::numeric_limits<double>::epsilon() * std::max(1.0, std::fabs(log_shape))) break;
  }
  const double shape = std::exp(log_shape);
  return {shape, mean(positive) / shape};
}

double gamma_cdf(Gamma gamma, double x) {
  if (std::isnan(gamma.shape) || std::isnan(gamma.scale) || std::isnan(x)) return kNone;
  if (x <= 0) return 0;
  if (std::isinf(x)) return 1;
  return boost::math::gamma_p(gamma.shape, x / gamma.scale);
}

double gamma_quantile(Gamma gamma, double p) {
  if (std::isnan(gamma.shape) || std::isnan(gamma.scale) || std::isnan(p)) return kNone;
  if (p <= 0) return 0;
  if (p >= 1) return std::numeric_limits<double>::infinity();
  return gamma.scale * boost::math::gamma_p_inv(gamma.shape, p);
}

}  // namespace windrow::stats
