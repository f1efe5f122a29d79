// Laws of the statistics over members.
#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <numeric>
#include <random>
#include <vector>

#include "windrow/ensemble/ensemble.h"

using namespace windrow::ensemble;

namespace {
const double kNaN = std::numeric_limits<double>::quiet_NaN();
}

TEST_CASE("quantiles over members are those of type 7") {
  // Hyndman & Fan 1996 define the types; the numbers are those of the NumPy test suite for {15, 20, 35, 40, 50}, p =
  // 0.4, and for p = 0.25 and {1..10}, p = 0.9 computed with it.
  std::vector<double> five{40, 15, 50, 20, 35};
  CHECK(quantile(five, 0.4) == doctest::Approx(29).epsilon(1e-15));
  CHECK(quantile(five, 0.25) == 20);
  std::vector<double> ten(10);
  std::iota(ten.begin(), ten.end(), 1.0);
  CHECK(quantile(ten, 0.9) == doctest::Approx(9.1).epsilon(1e-15));
  CHECK(quantile(ten, 0) == 1);
  CHECK(quantile(ten, 1) == 10);
}

TEST_CASE("the spread has n - 1 and needs two members") {
  CHECK(spread(std::vector<double>{2, 4, 4, 4, 5, 5, 7, 9}) == doctest::Approx(std::sqrt(32.0 / 7)).epsilon(1e-15));
  CHECK(std::isnan(spread(std::vector<double>{1})));
  CHECK(spread(std::vector<double>{3, 3, 3}) == 0);
}

TEST_CASE("the agreement is the share with the sign of the mean") {
  CHECK(agreement(std::vector<double>{1, 2, -1}) == doctest::Approx(2.0 / 3));
  CHECK(agreement(std::vector<double>{-1, -2, 0.5, 0}) == 0.5);
  CHECK(agreement(std::vector<double>{1, 1, -5}) == doctest::Approx(1.0 / 3));  // one large change decides the mean
  CHECK(agreement(std::vector<double>{0, 0}) == 1);
  CHECK(agreement(std::vector<double>{1, -1}) == 0);
}

TEST_CASE("a missing member makes every statistic missing") {
  std::vector<double> members{1, kNaN, 3};
  CHECK(std::isnan(mean(members)));
  CHECK(std::isnan(spread(members)));
  CHECK(std::isnan(agreement(members)));
  CHECK(std::isnan(quantile(members, 0.5)));
  CHECK(std::isnan(mean({})));
}

TEST_CASE("an added constant moves mean and quantiles and leaves the spread") {
  std::mt19937 draw(20261);  // pinned
  std::uniform_int_distribution<int> whole(-1000, 1000);
  for (int round = 0; round < 200; ++round) {
    std::vector<double> a(8), b;
    for (double& x : a) x = whole(draw);
    for (const double x : a) b.push_back(x + 64);  // whole numbers over powers of two: exact
    CHECK(mean(b) == mean(a) + 64);
    CHECK(spread(b) == spread(a));
    CHECK(quantile(b, 0.5) == quantile(a, 0.5) + 64);
  }
}
