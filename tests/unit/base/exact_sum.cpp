// Laws of the order-independent sums.
#include "windrow/base/exact_sum.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <random>
#include <vector>

using windrow::BinnedSum;
using windrow::ExactSum;

namespace {
std::vector<double> nasty_terms(std::size_t count, unsigned seed) {
  std::mt19937_64 random(seed);
  std::vector<double> terms(count);
  for (auto& x : terms) {
    const double mantissa = static_cast<double>(random() >> 11) * 0x1p-53 + 0.5;
    x = std::ldexp((random() & 1) != 0 ? mantissa : -mantissa, static_cast<int>(random() % 120) - 60);
  }
  return terms;
}
}  // namespace

TEST_CASE("an exact sum does not depend on the order of its terms and equals the wide reference") {
  for (unsigned seed = 1; seed <= 20; ++seed) {
    auto terms = nasty_terms(1000, seed);
    ExactSum forward, backward, merged, part;
    for (double x : terms) forward.add(x);
    std::sort(terms.begin(), terms.end());
    for (double x : terms) backward.add(x);
    for (std::size_t i = 0; i < terms.size(); ++i) (i % 3 == 0 ? merged : part).add(terms[i]);
    merged.add(part);
    CHECK(forward.value() == backward.value());
    CHECK(forward.value() == merged.value());
    // Kahan-Neumaier in long double (64-bit mantissa): good to about 1e-19 of the largest term here.
    long double sum = 0, carry = 0;
    for (double x : terms) {
      const long double next = sum + x;
      carry += std::fabs(sum) >= std::fabs(static_cast<long double>(x)) ? (sum - next) + x : (x - next) + sum;
      sum = next;
    }
    CHECK(std::fabs(static_cast<double>(sum + carry) - forward.value()) <=
          2e-16 * std::fabs(forward.value()) + 1e-19 * std::fabs(terms.back()));
  }
}

TEST_CASE("an exact sum keeps what plain addition loses") {
  ExactSum sum;
  sum.add(1e300);
  sum.add(1.0);
  sum.add(-1e300);
  sum.add(5e-324);
  CHECK(sum.value() == 1.0);
  ExactSum ties;
  ties.add(1.0);
  ties.add(0x1p-53);
  CHECK(ties.value() == 1.0);
  ties.add(0x1p-106);
  CHECK(ties.value() == 1.0 + 0x1p-52);
  ExactSum negative;
  negative.add(-3.0);
  negative.add(1.0);
  CHECK(negative.value() == -2.0);
  ExactSum bad;
  bad.add(NAN);
  CHECK(std::isnan(bad.value()));
}

TEST_CASE("a binned sum is the same bits in any order and keeps double precision") {
  std::mt19937_64 random(7);
  for (const std::size_t count : {1UL, 17UL, 4800UL, 100000UL}) {
    std::vector<double> terms(count);
    for (auto& x : terms) x = 287.0 * (static_cast<double>(random() >> 11) * 0x1p-53 - 0.2);
    const auto bins = BinnedSum::bins(287.0, count);
    BinnedSum a(bins), b(bins);
    ExactSum exact;
    for (double x : terms) {
      a.add(x);
      exact.add(x);
    }
    std::shuffle(terms.begin(), terms.end(), random);
    double high = 0, low = 0;  // merged from pieces, as tiles do
    for (std::size_t start = 0; start < count; start += 1000) {
      BinnedSum piece(bins);
      for (std::size_t i = start; i < std::min(count, start + 1000); ++i) piece.add(terms[i]);
      high += piece.high();
      low += piece.low();
    }
    for (double x : terms) b.add(x);
    CHECK(a.high() == b.high());
    CHECK(a.low() == b.low());
    CHECK(high == a.high());
    CHECK(low == a.low());
    CHECK(std::fabs(a.value() - exact.value()) <= 2e-16 * std::fabs(exact.value()) + 1e-25);
  }
}
