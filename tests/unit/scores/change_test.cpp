// Laws of the change between two periods before and after the adjustment.
#include <doctest/doctest.h>

#include "series.h"
#include "windrow/scores/change.h"

using namespace windrow;
using namespace windrow::scores;
using invented::kNaN;
using invented::season;

namespace {

const Resampling kDraws{7, 3, 200};
constexpr Period kEarly{1961, 1980}, kLate{1981, 2000};

}  // namespace

TEST_CASE("an adjustment by a constant keeps the change, by a factor keeps the ratio") {
  const Days days = invented::years(1961, 2000);
  auto modelled = invented::temperature(days, 10, 3, 1);
  for (std::size_t i = 0; i < days.size(); ++i) modelled[i] += 0.05 * (days.date(i).year - 1961);
  auto shifted = modelled;
  for (double& v : shifted) v += 4;
  const Change change =
      change_between(days, season("MAM"), modelled, shifted, kEarly, kLate, ChangeKind::difference, kDraws);
  CHECK(change.modelled > 0.5);
  CHECK(std::fabs(change.added) < 1e-12);
  CHECK(std::fabs(change.added_interval.low) < 1e-12);
  CHECK(std::fabs(change.added_interval.high) < 1e-12);
  CHECK_FALSE(change.too_small);
  CHECK(change.early_years == 20);

  auto rain = invented::rain(days, 6, 2);
  auto doubled = rain;
  for (double& v : doubled) v *= 2;
  const Change ratio = change_between(days, season("JJA"), rain, doubled, kEarly, kLate, ChangeKind::ratio, kDraws);
  CHECK(ratio.added == 0);
  CHECK(ratio.kept);
  CHECK(ratio.product == ratio.modelled);
  const Change difference =
      change_between(days, season("JJA"), rain, doubled, kEarly, kLate, ChangeKind::difference, kDraws);
  CHECK(difference.product == doctest::Approx(2 * difference.modelled).epsilon(1e-12));
}

TEST_CASE("a change that the adjustment doubles is not kept") {
  const Days days = invented::years(1961, 2000);
  const auto modelled = invented::temperature(days, 10, 1, 3);
  auto product = modelled;
  for (std::size_t i = 0; i < days.size(); ++i) product[i] += days.date(i).year > 1980 ? 1 : 0;
  const Change change =
      change_between(days, season("year"), modelled, product, kEarly, kLate, ChangeKind::difference, kDraws);
  CHECK(change.added == doctest::Approx(1).epsilon(1e-12));
  CHECK(change.added_interval.low > 0.999);
  CHECK_FALSE(change.kept);
}

TEST_CASE("winters belong to the period of their January; an empty period has no change") {
  const Days days = invented::years(1961, 2000);
  const auto modelled = invented::temperature(days, 10, 1, 4);
  auto product = modelled;
  for (std::size_t i = 0; i < days.size(); ++i) {
    if (days.date(i).year == 1980 && days.date(i).month == 12) product[i] += 31;  // winter 1981
  }
  const Change change =
      change_between(days, season("DJF"), modelled, product, kEarly, kLate, ChangeKind::difference, kDraws);
  // 31 days by 31 K of the late winters' days: 20 winters, of which 1984, 1988, 1992, 1996 and 2000 have 91.
  CHECK(change.added == doctest::Approx(31.0 * 31 / (20 * 90 + 5)).epsilon(1e-10));
  const Change none =
      change_between(days, season("DJF"), modelled, product, {1900, 1910}, kLate, ChangeKind::difference, kDraws);
  CHECK(std::isnan(none.modelled));
  CHECK(std::isnan(none.added_interval.low));
  CHECK(none.too_small);
  CHECK_FALSE(none.kept);
}

TEST_CASE("a ratio over a dry period does not exist, and ten years a period are enough") {
  const Days days = invented::years(1961, 2000);
  auto rain = invented::rain(days, 6, 5);
  for (std::size_t i = 0; i < days.size(); ++i) rain[i] = days.date(i).year <= 1980 ? 0 : rain[i];
  CHECK(std::isnan(change_between(days, season("July"), rain, rain, kEarly, kLate, ChangeKind::ratio, kDraws).added));
  const Change ten =
      change_between(days, season("July"), rain, rain, {1961, 1970}, {1991, 2000}, ChangeKind::difference, kDraws);
  CHECK_FALSE(ten.too_small);
  CHECK(ten.kept);
  CHECK(
      change_between(days, season("July"), rain, rain, {1961, 1969}, kLate, ChangeKind::difference, kDraws).too_small);
}
