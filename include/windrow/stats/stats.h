// Statistics without knowledge of climate: quantiles, moments, monotone regression.
#pragma once
#include <span>
#include <vector>

namespace windrow::stats {

/// Sample quantile of an ascending sample, types 4..9 of Hyndman & Fan 1996 (Am. Stat. 50:361) by (alpha, beta), and the
/// discontinuous types 1..3. Empty sample: NaN.
double quantile(std::span<const double> ascending, double p, int type);

/// Pool adjacent violators: the non-decreasing sequence nearest in least squares (equal weights), in place. Returns how
/// many entries moved.
int make_non_decreasing(std::span<double> values);

double mean(std::span<const double> values);      ///< NaN for an empty sample; summed pairwise in fixed order

}  // namespace windrow::stats
