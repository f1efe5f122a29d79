// Laws of taking years out of a record. The record is invented.
#include <doctest/doctest.h>

#include "windrow/station/station.h"

namespace windrow::station {
namespace {

/// Every day of 2001 to 2004, whose value is its year; normals beside.
Record four_years() {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "test");
  Record out;
  out.site.id = "a1";
  out.normal.assign(12, 7.0);
  out.resolution = 0.1;
  out.complete_years = 4;
  for (int year = 2001; year <= 2004; ++year) {
    for (int month = 1; month <= 12; ++month) {
      out.monthly.push_back({year, month, static_cast<double>(year)});
      for (int day = 1; day <= gregorian.days_in_month(year, month); ++day) {
        out.daily.day.push_back(gregorian.day_number({year, month, day}));
        out.daily.value.push_back(year);
      }
    }
  }
  return out;
}

TEST_CASE("of chosen years nothing else is left, neither days nor months nor normals") {
  const auto part = of_years(four_years(), {2002, 2004});
  CHECK(part.site.id == "a1");
  CHECK(part.resolution == 0.1);
  CHECK(part.daily.day.size() == 365 + 366);
  CHECK(part.daily.value.front() == 2002);
  CHECK(part.daily.value.back() == 2004);
  CHECK(part.monthly.size() == 24);
  CHECK(part.normal.empty());
  CHECK(part.complete_years == 2);
}

TEST_CASE("parts of disjoint years make up the whole") {
  const auto whole = four_years();
  const auto odd = of_years(whole, {2001, 2003}), even = of_years(whole, {2002, 2004});
  CHECK(odd.daily.day.size() + even.daily.day.size() == whole.daily.day.size());
  CHECK(odd.monthly.size() + even.monthly.size() == whole.monthly.size());
  const auto none = of_years(whole, {});
  CHECK(none.daily.day.empty());
  CHECK(none.complete_years == 0);
}

}  // namespace
}  // namespace windrow::station
