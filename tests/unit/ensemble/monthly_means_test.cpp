// Laws of monthly climatologies.
#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <vector>

#include "windrow/ensemble/ensemble.h"

using namespace windrow::ensemble;

namespace {

const float kGap = std::numeric_limits<float>::quiet_NaN();

void add_month(MonthlyMeans& means, int year, int month, int days, float value) {
  for (int day = 0; day < days; ++day) means.add(year, month, std::vector<float>{value, -value});
}

}  // namespace

TEST_CASE("every year's month counts the same, whatever its days") {
  MonthlyMeans means(2, 2);
  add_month(means, 2003, 2, 28, 1);
  add_month(means, 2004, 2, 29, 3);
  const auto out = means.finish();
  REQUIRE(out.size() == 24);
  CHECK(out[2] == 2);
  CHECK(out[3] == -2);
  CHECK(std::isnan(out[0]));  // January never came
}

TEST_CASE("a month with a missing step is left out, and four of five years suffice") {
  for (const int gaps : {0, 1, 2}) {
    CAPTURE(gaps);
    MonthlyMeans means(1, 5);
    for (int year = 0; year < 5; ++year) {
      means.add(2000 + year, 7, std::vector<float>{static_cast<float>(year)});
      means.add(2000 + year, 7, std::vector<float>{year < gaps ? kGap : static_cast<float>(year)});
    }
    const auto out = means.finish();
    if (gaps == 0) CHECK(out[6] == 2);
    if (gaps == 1) CHECK(out[6] == 2.5);
    if (gaps == 2) CHECK(std::isnan(out[6]));
  }
}
