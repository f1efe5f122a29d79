// Laws of quantiles, means and monotone regression.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <random>

#include "windrow/base/error.h"
#include "windrow/stats/stats.h"

using namespace windrow;
using namespace windrow::stats;

TEST_CASE("the nine quantile types give the values of the public NumPy test suite") {
  // First row: NumPy 1.24, numpy/lib/tests/test_function_base.py, TestPercentile.test_linear_interpolation. The others
  // were computed with numpy.quantile 1.24 (its methods in the order of Hyndman & Fan 1996).
  struct Row {
    std::vector<double> sample;
    double p, expected[9];
  };
  const Row rows[] = {{{15, 20, 35, 40, 50}, 0.4, {20, 27.5, 20, 20, 27.5, 26, 29, 27, 27.125}},
                      {{15, 20, 35, 40, 50}, 0.25, {20, 20, 15, 16.25, 18.75, 17.5, 20, 55.0 / 3, 18.4375}},
                      {{1, 2, 3, 4, 5, 6, 7, 8, 9, 10}, 0.9, {9, 9.5, 9, 9, 9.5, 9.9, 9.1, 9 + 19.0 / 30, 9.6}}};
  for (const Row& row : rows) {
    for (int type = 1; type <= 9; ++type) {
      CAPTURE(type);
      // 4 rounding errors of the largest value.
      CHECK(std::fabs(quantile(row.sample, row.p, type) - row.expected[type - 1]) <= 50 * 4 * 2.3e-16);
    }
  }
}

TEST_CASE("quantiles stay in the sample's range, rise with p and keep the ends") {
  std::mt19937_64 random(1996);
  for (int round = 0; round < 200; ++round) {
    std::vector<double> sample(1 + random() % 40);
    for (double& x : sample) x = static_cast<double>(random() % 1000) / 7 - 50;
    std::sort(sample.begin(), sample.end());
    for (int type = 1; type <= 9; ++type) {
      double last = sample.front();
      CHECK(quantile(sample, 0, type) == sample.front());
      CHECK(quantile(
                sample.size(), [&sample](std::size_t k) { return sample[k]; }, 0.3, type) ==
            quantile(sample, 0.3, type));
      CHECK(quantile(sample, 1, type) == sample.back());
      for (int i = 0; i <= 200; ++i) {
        const double q = quantile(sample, i / 200.0, type);
        REQUIRE(q >= last);
        REQUIRE(q <= sample.back());
        last = q;
      }
    }
  }
}

TEST_CASE("type 1 inverts the empirical distribution: the least value with at least a share p") {
  std::mt19937_64 random(50361);
  for (int round = 0; round < 300; ++round) {
    const auto n = static_cast<int>(1 + random() % 120);
    std::vector<double> sample;
    for (int i = 0; i < n; ++i) sample.push_back(i + 1);
    for (int k = 1; k <= n; ++k) {
      // p = k/n exactly in the reals: element k, whatever the rounding of k/n.
      REQUIRE(quantile(sample, static_cast<double>(k) / n, 1) == k);
    }
  }
  std::vector<double> hundred;
  for (int i = 1; i <= 100; ++i) hundred.push_back(i);
  CHECK(quantile(hundred, 0.07, 1) == 7);  // 100 * 0.07 is 7.000000000000001 in binary
  CHECK(quantile(hundred, 0.07, 4) == 7);
}

TEST_CASE("a sample of one is its own quantile, an empty one has none") {
  const std::vector<double> one = {3.5}, none;
  for (int type = 1; type <= 9; ++type) {
    for (const double p : {0.0, 0.3, 1.0}) CHECK(quantile(one, p, type) == 3.5);
    CHECK(std::isnan(quantile(none, 0.5, type)));
  }
  CHECK(std::isnan(quantile(one, std::nan(""), 7)));
  CHECK_THROWS_AS((void)quantile(one, 0.5, 10), Error);
}

TEST_CASE("monotone regression is the nearest non-decreasing sequence") {
  // Min-max formula: value i = max over a <= i of min over b >= i of mean(a..b) (Barlow et al. 1972, from memory).
  std::mt19937_64 random(77);
  for (int round = 0; round < 400; ++round) {
    std::vector<double> values(1 + random() % 15);
    for (double& v : values) v = static_cast<double>(random() % 64);
    std::vector<double> expected(values.size());
    for (std::size_t i = 0; i < values.size(); ++i) {
      double best = -1e300;
      for (std::size_t a = 0; a <= i; ++a) {
        double least = 1e300;
        for (std::size_t b = i; b < values.size(); ++b) {
          double sum = 0;
          for (std::size_t k = a; k <= b; ++k) sum += values[k];
          least = std::min(least, sum / static_cast<double>(b - a + 1));
        }
        best = std::max(best, least);
      }
      expected[i] = best;
    }
    std::vector<double> fitted = values;
    const int moved = make_non_decreasing(fitted);
    int differ = 0;
    for (std::size_t i = 0; i < values.size(); ++i) {
      REQUIRE(fitted[i] == expected[i]);  // sums of small whole numbers are exact
      differ += fitted[i] != values[i];
    }
    REQUIRE(moved == differ);
    REQUIRE(std::is_sorted(fitted.begin(), fitted.end()));
    REQUIRE(make_non_decreasing(fitted) == 0);
  }
}

TEST_CASE("a non-decreasing sequence is left bit for bit, any other keeps its sum") {
  std::vector<double> rising = {-1.1, 0.1, 0.1, 0.7, 3.3};
  const std::vector<double> before = rising;
  CHECK(make_non_decreasing(rising) == 0);
  CHECK(rising == before);
  std::vector<double> falling = {4, 3, 2, 1};
  CHECK(make_non_decreasing(falling) == 4);
  CHECK(falling == std::vector<double>{2.5, 2.5, 2.5, 2.5});
  std::vector<double> empty;
  CHECK(make_non_decreasing(empty) == 0);
}

TEST_CASE("the mean is accurate over many values and NaN over none") {
  CHECK(std::isnan(mean({})));
  CHECK(mean(std::vector<double>{1, 2, 6}) == 3);
  const std::vector<double> tenths(1'000'000, 0.1);
  // Pairwise summation: about log2(n/16)/2 + 16 rounding errors at worst; a plain running sum is off by 1.3e-11 here.
  CHECK(std::fabs(mean(tenths) - 0.1) <= 0.1 * 32 * 1.2e-16);
}
