// Statistics without knowledge of climate: quantiles, moments, monotone regression.
#pragma once
#include <cstddef>
#include <functional>
#include <span>
#include <vector>

namespace windrow::stats {

/// Sample quantile of an ascending sample, types 4..9 of Hyndman & Fan 1996 (Am. Stat. 50:361) by (alpha, beta), and
/// the discontinuous types 1..3. Empty sample: NaN.
double quantile(std::span<const double> ascending, double p, int type);
/// The same of a sample that is not laid out: `ascending` gives its k-th value, from 0.
double quantile(std::size_t size, const std::function<double(std::size_t)>& ascending, double p, int type);

/// Pool adjacent violators: the non-decreasing sequence nearest in least squares (equal weights), in place. Returns how
/// many entries moved.
int make_non_decreasing(std::span<double> values);

double mean(std::span<const double> values);  ///< NaN for an empty sample; summed pairwise in fixed order

/// Sample variance: squared departures from the mean (two passes) over n - 1. NaN for fewer than two values.
double variance(std::span<const double> values);
double standard_deviation(std::span<const double> values);  ///< square root of the variance

/// Pearson's correlation of two samples of one length (Error(defect) otherwise). NaN for fewer than two values or where
/// a sample is constant; within [-1, 1].
double correlation(std::span<const double> a, std::span<const double> b);

}  // namespace windrow::stats
