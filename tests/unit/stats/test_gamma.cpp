// Laws and check values of gamma fits and of the gamma distribution.
#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <random>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/stats/gamma.h"
#include "windrow/stats/stats.h"

using namespace windrow;
using namespace windrow::stats;

namespace {

bool near(double found, double expected, double relative) {
  return std::fabs(found - expected) <= relative * std::fabs(expected);
}

}  // namespace

TEST_CASE("gamma fits of two small samples give the values computed from their definitions") {
  // Computed from the equations in gamma.h (no published numeric example is known); as many digits as are given.
  struct Row {
    std::vector<double> sample;
    double excess, thom, likelihood, scale;
    double half_digit[4];
  };
  const Row rows[] = {
      {{1, 2, 3, 4, 5}, 0.1411139401, 3.702724, 3.701644, 0.810451, {5e-11, 5e-7, 5e-7, 5e-7}},
      {{0.5, 1, 2, 4, 8, 16}, 0.6185073, 0.950193, 0.940142, 5.584265, {5e-8, 5e-7, 5e-7, 5e-7}},
  };
  for (const Row& row : rows) {
    CHECK(std::fabs(log_mean_excess(row.sample) - row.excess) <= row.half_digit[0] * 1.01);
    CHECK(std::fabs(fit_gamma_thom(row.sample).shape - row.thom) <= row.half_digit[1] * 1.01);
    CHECK(std::fabs(fit_gamma(row.sample).shape - row.likelihood) <= row.half_digit[2] * 1.01);
    CHECK(std::fabs(fit_gamma(row.sample).scale - row.scale) <= row.half_digit[3] * 1.01);
  }
}

TEST_CASE("a factor on the sample goes to the scale of a gamma fit and leaves the shape") {
  std::mt19937_64 random(1958);
  std::gamma_distribution<double> draw(0.7, 6);
  for (int round = 0; round < 50; ++round) {
    std::vector<double> sample(30), doubled;
    for (double& x : sample) x = draw(random) + 1e-9;
    for (const double x : sample) doubled.push_back(4 * x);  // a power of two: the same bits up to the exponent
    for (const auto fit : {fit_gamma, fit_gamma_thom}) {
      CHECK(fit(doubled).shape == fit(sample).shape);
      CHECK(fit(doubled).scale == 4 * fit(sample).scale);
    }
  }
}

TEST_CASE("no other gamma distribution makes the sample likelier than the fitted one") {
  std::mt19937_64 random(86117);
  for (const double shape : {0.05, 0.5, 1.0, 3.0, 40.0, 2000.0}) {
    std::gamma_distribution<double> draw(shape, 2);
    std::vector<double> sample(50);
    for (double& x : sample) x = std::max(draw(random), 1e-280);
    const Gamma fit = fit_gamma(sample);
    const auto likelihood = [&sample](double a, double b) {
      double sum = 0;
      for (const double x : sample) sum += (a - 1) * std::log(x) - x / b - a * std::log(b) - std::lgamma(a);
      return sum;
    };
    const double best = likelihood(fit.shape, fit.scale);
    CAPTURE(shape);
    for (const double step : {0.98, 1.02}) {
      CHECK(likelihood(fit.shape * step, fit.scale) < best);
      CHECK(likelihood(fit.shape, fit.scale * step) < best);
      CHECK(likelihood(fit.shape * step, fit.scale / step) < best);
    }
  }
}

TEST_CASE("nearly equal values keep their digits in a gamma fit") {
  // x = c (1 - d, 1 + d): A = -ln(1 - d^2)/2 exactly, and shape = 1/(2A) + 1/6 + O(A) there.
  for (const double d : {0x1p-10, 0x1p-16, 0x1p-20}) {
    const std::vector<double> sample = {1 - d, 1 + d};
    const double excess = -std::log1p(-d * d) / 2;
    CAPTURE(d);
    CHECK(near(log_mean_excess(sample), excess, 1e-14));
    CHECK(near(fit_gamma(sample).shape, 1 / (2 * excess) + 1.0 / 6, 1e-12));
  }
}

TEST_CASE("values all alike, one value and none have no gamma fit; zeros and missing values are a defect") {
  for (const std::vector<double>& sample : {std::vector<double>{}, {2.5}, {0.1, 0.1, 0.1}}) {
    CHECK(std::isnan(fit_gamma(sample).shape));
    CHECK(std::isnan(fit_gamma(sample).scale));
    CHECK(std::isnan(fit_gamma_thom(sample).shape));
    CHECK(std::isnan(gamma_cdf(fit_gamma(sample), 1)));
    CHECK(std::isnan(gamma_quantile(fit_gamma(sample), 0.5)));
  }
  for (const double bad : {0.0, -1.0, std::nan(""), std::numeric_limits<double>::infinity()}) {
    CHECK_THROWS_AS((void)fit_gamma(std::vector<double>{1, bad}), Error);
    CHECK_THROWS_AS((void)fit_gamma_thom(std::vector<double>{1, bad}), Error);
  }
}

TEST_CASE("shape 1 is the exponential distribution, quantiles invert the distribution function") {
  for (const double p : {1e-9, 0.05, 0.5, 0.95, 0.999}) {
    CHECK(near(gamma_quantile({1, 3}, p), -3 * std::log1p(-p), 1e-14));
    for (const double shape : {0.1, 0.8, 5.0, 300.0}) {
      CAPTURE(p);
      CAPTURE(shape);
      CHECK(near(gamma_cdf({shape, 2.5}, gamma_quantile({shape, 2.5}, p)), p, 1e-12));
    }
  }
  CHECK(gamma_cdf({2, 1}, 0) == 0);
  CHECK(gamma_cdf({2, 1}, -1) == 0);
  CHECK(gamma_cdf({2, 1}, std::numeric_limits<double>::infinity()) == 1);
  CHECK(gamma_quantile({2, 1}, 0) == 0);
  CHECK(std::isinf(gamma_quantile({2, 1}, 1)));
  CHECK(std::isnan(gamma_quantile({2, 1}, std::nan(""))));
}

TEST_CASE("variance and correlation of small samples, worked by hand") {
  CHECK(variance(std::vector<double>{1, 2, 6}) == 7);
  CHECK(standard_deviation(std::vector<double>{1, 3, 5}) == 2);
  CHECK(std::isnan(variance(std::vector<double>{1})));
  CHECK(variance(std::vector<double>(30, 0.1)) == 0);
  CHECK(near(correlation(std::vector<double>{1, 2, 3}, std::vector<double>{1, 3, 2}), 0.5, 1e-15));
  CHECK(correlation(std::vector<double>{1, 2, 4}, std::vector<double>{-1, -2, -4}) == -1);
  CHECK(std::isnan(correlation(std::vector<double>{0.1, 0.1, 0.1}, std::vector<double>{1, 2, 3})));
  CHECK(std::isnan(correlation(std::vector<double>{1}, std::vector<double>{1})));
  CHECK_THROWS_AS((void)correlation(std::vector<double>{1, 2}, std::vector<double>{1}), Error);
}

TEST_CASE("the continuous quantile types pass through the sample at their plotting positions") {
  // p_k = (k - alpha) / (n + 1 - alpha - beta), Hyndman & Fan 1996; alpha and beta as in the documentation of SciPy's
  // mquantiles.
  const double plotting[6][2] = {{0, 1}, {0.5, 0.5}, {0, 0}, {1, 1}, {1.0 / 3, 1.0 / 3}, {3.0 / 8, 3.0 / 8}};
  const std::vector<double> sample = {-3, 0.5, 0.75, 11, 100};
  for (int type = 4; type <= 9; ++type) {
    const double alpha = plotting[type - 4][0], beta = plotting[type - 4][1];
    for (int k = 1; k <= 5; ++k) {
      CHECK(quantile(sample, (k - alpha) / (6 - alpha - beta), type) == sample[static_cast<std::size_t>(k - 1)]);
    }
  }
}
