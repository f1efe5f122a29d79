// Laws of dates and factors: what moves a station's day, what multiplies its sums. All tables are invented.
#include <doctest/doctest.h>

#include "windrow/base/error.h"
#include "windrow/station/station.h"

namespace windrow::station {
namespace {

text::CsvTable table(const std::string& text, const std::string& file) { return text::CsvTable::parse(text, file); }

std::string rows(int first, int last) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "test");
  std::string text = "station,date,pr [mm]\n";
  for (auto day = gregorian.day_number({first, 1, 1}); day <= gregorian.day_number({last, 12, 31}); ++day) {
    text += "a1," + calendar::to_string(gregorian.date(day)) + "," + std::to_string(day % 7) + "\n";
  }
  return text;
}

Options rain() {
  Options o;
  o.observed = {"pr"};
  o.units = "mm/day";
  o.kind = Kind::sum;
  o.per_day_rate = true;
  o.low = 0;
  o.high = 2000;
  o.min_years = 1;
  return o;
}

const char* const kSites = "station,longitude,latitude,elevation,factor\na1,10,50,120,1.25\nb2,11,51,10,\n";

}  // namespace

TEST_CASE("daily values move by whole days where their hours are not known; nothing else moves") {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "test");
  for (const bool known : {false, true}) {
    Options options = rain();
    options.day_shift = -1;
    Notices notices;
    const Tables tables{table(kSites, "s.csv"), {table(rows(2001, 2003), "d.csv")}, {}, {}, {known}};
    const auto records = read_records(tables, {}, options, notices);
    REQUIRE(records.size() == 1);
    // Moved, the last month lacks its last day and, a sum, is incomplete; so is the one day before the first.
    CHECK(records[0].monthly.size() == (known ? 36 : 35));
    const auto& daily = records[0].daily;
    CHECK(daily.day.front() == gregorian.day_number({2001, 1, 1}));
    for (std::size_t i = 0; i < daily.day.size(); ++i) {
      REQUIRE(daily.value[i] == double((daily.day[i] + (known ? 0 : 1)) % 7));
    }
  }
}

TEST_CASE("undercatch factors multiply sums; a station without one is left out and told") {
  Options options = rain();
  Notices notices;
  const std::string two = rows(2001, 2002);
  std::string both = two;
  for (std::size_t at = two.find('\n') + 1; at < two.size();) {
    const std::size_t end = two.find('\n', at);
    both += "b2" + two.substr(at + 2, end - at - 1);
    at = end + 1;
  }
  const Tables tables{table(kSites, "s.csv"), {table(both, "d.csv")}, {}, {}, {}};
  const auto plain = read_records(tables, {}, options, notices);
  REQUIRE(plain.size() == 2);
  CHECK(plain[0].resolution == 1);
  options.undercatch = "factor";
  Notices told;
  const auto caught = read_records(tables, {}, options, told);
  REQUIRE(caught.size() == 1);
  CHECK(caught[0].site.id == "a1");
  CHECK(caught[0].resolution == 1);
  for (std::size_t i = 0; i < caught[0].daily.value.size(); ++i) {
    REQUIRE(caught[0].daily.value[i] == 1.25 * plain[0].daily.value[i]);
  }
  for (std::size_t i = 0; i < caught[0].monthly.size(); ++i) {
    REQUIRE(caught[0].monthly[i].value == 1.25 * plain[0].monthly[i].value);
  }
  bool said = false;
  for (const Notice& n : told.list()) {
    said = said || n == Notice{"s.csv", "station 'b2' has no undercatch factor in column 'factor' and is left out"};
  }
  CHECK(said);
  const auto failure = [&](const char* sites, const char* column) {
    options.undercatch = column;
    try {
      read_records({table(sites, "s.csv"), {table(two, "d.csv")}, {}, {}, {}}, {}, options, told);
    } catch (const Error& e) {
      return std::string(e.what());
    }
    return std::string("no error");
  };
  CHECK(failure(kSites, "catch") ==
        "s.csv: no column 'catch' of undercatch factors; it has station, longitude, latitude, elevation, factor");
  CHECK(failure("station,longitude,latitude,f\na1,1,2,0\n", "f") ==
        "s.csv:2: column 'f': 0 is no undercatch factor; expected one above 0 and at most 10");
}

}  // namespace windrow::station
