// The gamma distribution of positive values: fits, distribution function and quantiles. Which days are wet, and what
// zeros mean, is not decided here.
#pragma once
#include <span>

namespace windrow::stats {

/// Density x^(shape-1) exp(-x/scale) / (scale^shape Gamma(shape)), x > 0. Both NaN where there is no fit.
struct Gamma {
  double shape, scale;
};

/// A = ln(mean x) - mean(ln x), from departures from the mean, so that it keeps its digits where values are nearly
/// alike. NaN for an empty sample. Error(defect) for a value that is not finite and > 0, here and in both fits.
double log_mean_excess(std::span<const double> positive);

/// Thom 1958 (Mon. Weather Rev. 86:117): shape = (1 + sqrt(1 + 4A/3)) / (4A), scale = mean/shape. No fit (NaN) for
/// fewer than two values or values all alike.
Gamma fit_gamma_thom(std::span<const double> positive);

/// Maximum likelihood: ln(shape) - psi(shape) = A, by Newton's method in ln(shape) from Thom's estimate; scale =
/// mean/shape. No fit (NaN) as above.
Gamma fit_gamma(std::span<const double> positive);

/// P(X <= x): 0 for x <= 0, NaN where there is no fit or x is NaN.
double gamma_cdf(Gamma gamma, double x);

/// The x with gamma_cdf(x) = p: 0 for p <= 0, infinite for p >= 1, NaN where there is no fit or p is NaN.
double gamma_quantile(Gamma gamma, double p);

}  // namespace windrow::stats
