// Laws of annual means and of the windows in which a warming level is reached. All series are invented.
#include <doctest/doctest.h>

#include <limits>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/ensemble/ensemble.h"

using namespace windrow::ensemble;
using windrow::calendar::Calendar;
using windrow::calendar::Date;

namespace {

/// value(year) for each year of first..last.
template <class F>
std::vector<YearMean> series(int first, int last, F value) {
  std::vector<YearMean> out;
  for (int year = first; year <= last; ++year) out.push_back({year, value(year)});
  return out;
}

std::vector<Span> months(const Calendar& calendar, int first, int last) {
  std::vector<Span> out;
  for (int year = first; year <= last; ++year) {
    for (int month = 1; month <= 12; ++month) {
      const auto begin = calendar.instant({year, month, 1});
      const auto end = month == 12 ? calendar.instant({year + 1, 1, 1}) : calendar.instant({year, month + 1, 1});
      out.push_back({(begin + end) / 2, begin, end});
    }
  }
  return out;
}

}  // namespace

TEST_CASE("a linear rise reaches a level in the window whose mean does") {
  // 1/64 a year from 1900 on: the window n-9..n+10 has the mean of (n + 1/2 - 1900) / 64.
  const auto rise = series(1850, 2100, [](int year) { return year < 1900 ? 0.0 : (year - 1900) / 64.0; });
  const auto found = crossing(rise, 0, 1.5);
  REQUIRE(found.has_value());
  CHECK(found->centre == 1996);  // 1995.5 is the first mean of 1.5: n = 1995.5 rounds up to the next window
  CHECK(found->window == Years{1987, 2006});
  // Exactly reaching counts: n + 1/2 - 1900 = 64 * level.
  CHECK(crossing(rise, 0, 100.5 / 64)->centre == 2000);
  CHECK(crossing(rise, 0.25, 100.5 / 64 - 0.25)->centre == 2000);
}

TEST_CASE("the first window counts, also where the series falls back") {
  const auto hump = series(1900, 2100, [](int year) { return year >= 1990 && year < 2010 ? 2.0 : 0.0; });
  const auto found = crossing(hump, 0, 2);
  REQUIRE(found.has_value());
  CHECK(found->window == Years{1990, 2009});
  CHECK(found->centre == 1999);
  CHECK_FALSE(crossing(hump, 0, 2.0625).has_value());
  // A single year above the level is no 20-year mean above it.
  const auto peak = series(1900, 2100, [](int year) { return year == 2000 ? 10.0 : 0.0; });
  CHECK_FALSE(crossing(peak, 0, 1).has_value());
}

TEST_CASE("windows with a gap are passed over") {
  auto steps = series(1900, 2000, [](int year) { return year >= 1950 ? 1.0 : 0.0; });
  std::erase_if(steps, [](const YearMean& y) { return y.year == 1960; });
  const auto found = crossing(steps, 0, 1);
  REQUIRE(found.has_value());
  CHECK(found->window == Years{1961, 1980});
  CHECK_FALSE(crossing(series(1990, 2008, [](int) { return 5.0; }), 0, 1).has_value());  // 19 years
}

TEST_CASE("annual means weight months by their length and leave out years with gaps") {
  const Calendar calendar = Calendar::from_cf("standard", "test");
  const auto steps = months(calendar, 2003, 2004);
  std::vector<double> values(24, 0.0);
  values[1] = 365;   // February 2003: 28 of 365 days
  values[13] = 366;  // February 2004: 29 of 366 days
  auto means = annual_means(calendar, steps, values);
  REQUIRE(means.size() == 2);
  CHECK(means[0].value == doctest::Approx(28).epsilon(1e-14));
  CHECK(means[1].value == doctest::Approx(29).epsilon(1e-14));
  values[5] = std::numeric_limits<double>::quiet_NaN();
  means = annual_means(calendar, steps, values);
  REQUIRE(means.size() == 1);
  CHECK(means[0].year == 2004);
  // A year with eleven months is none.
  const std::vector<Span> short_of(steps.begin() + 1, steps.end());
  const std::vector<double> zeros(23, 0.0);
  CHECK(annual_means(calendar, short_of, zeros).size() == 1);
}

TEST_CASE("an annual step stands for the year that holds its time") {
  const Calendar calendar = Calendar::from_cf("360_day", "test");
  const auto at = [&](int year, int month) { return calendar.instant({year, month, 1}); };
  // Bounds in the middle of the years, as they are inferred for times on 1 January.
  const std::vector<Span> steps{{at(2000, 1), at(1999, 7), at(2000, 7)}, {at(2001, 1), at(2000, 7), at(2001, 7)}};
  const auto means = annual_means(calendar, steps, std::vector<double>{3, 4});
  REQUIRE(means.size() == 2);
  CHECK(means[0].year == 2000);
  CHECK(means[1].value == 4);
}

TEST_CASE("a reference needs all of its years") {
  const auto steps = series(1861, 1900, [](int year) { return year < 1881 ? 1.0 : 2.0; });
  CHECK(reference_mean(steps, {1861, 1900}, "gmst.nc") == 1.5);
  CHECK_THROWS_WITH_AS(reference_mean(steps, {1850, 1900}, "gmst.nc"),
                       "gmst.nc: the global mean has 40 of the 51 years of the reference 1850-1900; it holds 40 of the "
                       "years 1861 to 1900",
                       windrow::Error);
}
