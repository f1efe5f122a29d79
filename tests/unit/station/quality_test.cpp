// Laws of quality control: a planted fault is found by station, column, date and number; its clean twin stays silent.
// All series are invented: a seasonal cycle with pinned noise, or rain on a third of the days.
#include "windrow/station/quality.h"

#include <doctest/doctest.h>

#include <cmath>
#include <fstream>
#include <functional>
#include <limits>
#include <numbers>
#include <random>
#include <sstream>

namespace windrow::station {
namespace {

constexpr std::size_t kYears = 8;
constexpr std::uint64_t kSeed = 20241203;

std::int64_t day_of(int year, int month, int day) {
  return calendar::Calendar::from_cf("proleptic_gregorian", "").day_number({year, month, day});
}

double tenth(double x) { return std::round(10 * x) / 10; }

std::vector<std::int64_t> all_days() {
  std::vector<std::int64_t> out;
  for (auto day = day_of(2001, 1, 1); day <= day_of(2000 + int(kYears), 12, 31); ++day) out.push_back(day);
  return out;
}

std::vector<Site> sites_of(std::size_t count) {
  std::vector<Site> out;
  for (std::size_t i = 0; i < count; ++i) {
    Site site;
    site.id = std::string(1, char('A' + i));
    site.position = {Angle::degrees(-28 + 0.3 * double(i)), Angle::degrees(48 + 0.1 * double(i % 3))};
    site.elevation_m = 100;
    out.push_back(site);
  }
  return out;
}

/// Temperatures of one weather with a station's own noise.
ObservedColumn temperatures(std::size_t stations, double level = 9, const std::string& name = "tas") {
  ObservedColumn out{name, Quantity::temperature, false, {}};
  std::mt19937_64 weather(kSeed);
  std::normal_distribution<double> normal;
  const auto days = all_days();
  std::vector<double> common;
  for (const auto day : days) {
    common.push_back(level + 9 * std::sin(2 * std::numbers::pi * double(day % 365) / 365) + 3 * normal(weather));
  }
  for (std::size_t s = 0; s < stations; ++s) {
    std::mt19937_64 own(kSeed + 1 + s);
    DatedValues series{days, {}};
    for (const double x : common) series.value.push_back(tenth(x + 0.5 * double(s) + normal(own)));
    out.of.push_back(series);
  }
  return out;
}

ObservedColumn rain(std::size_t stations) {
  ObservedColumn out{"pr", Quantity::water, false, {}};
  const auto days = all_days();
  for (std::size_t s = 0; s < stations; ++s) {
    std::mt19937_64 own(kSeed + 31 + s);
    std::exponential_distribution<double> amount(1 / (6 + double(s)));
    std::bernoulli_distribution wet(0.33);
    DatedValues series{days, {}};
    for (std::size_t i = 0; i < days.size(); ++i) series.value.push_back(wet(own) ? tenth(amount(own)) : 0);
    out.of.push_back(series);
  }
  return out;
}

/// Turns the values of the years first..last.
template <class Change>
void plant(DatedValues& series, int first, int last, Change change) {
  for (std::size_t i = 0; i < series.date.size(); ++i) {
    if (series.date[i] >= day_of(first, 1, 1) && series.date[i] <= day_of(last, 12, 31)) {
      series.value[i] = change(series.value[i]);
    }
  }
}

Finding only(const std::vector<Finding>& findings) {
  for (const Finding& f : findings) CAPTURE(f.sentence);
  REQUIRE(findings.size() == 1);
  return findings.front();
}

double fahrenheit(double x) { return tenth(1.8 * x + 32); }

}  // namespace

TEST_CASE("clean series of any number of stations give no finding") {
  for (const std::size_t stations : {1U, 2U, 4U, 7U}) {
    CAPTURE(stations);
    const auto lowest = temperatures(stations, 5, "tmin");
    auto highest = lowest;
    highest.name = "tmax";
    for (auto& series : highest.of) {
      for (double& x : series.value) x += 8;
    }
    CHECK(check_columns(sites_of(stations), {lowest, highest, rain(stations)}).empty());
    CHECK(check_positions(sites_of(stations)).empty());
    CHECK(check_elevations(sites_of(stations), std::vector<double>(stations, 300.0)).empty());
  }
}

TEST_CASE("two stations with over 95 percent equal values on 365 common days are told, with 94 percent not") {
  for (const auto& [part, found] : {std::pair(0.96, true), std::pair(0.94, false)}) {
    const double share = part;
    CAPTURE(share);
    auto column = temperatures(3);
    column.of[2] = column.of[0];
    const std::size_t n = column.of[2].value.size();
    for (std::size_t i = 0; i < n; ++i) {
      if (std::fmod(double(i) * 0.61803398875, 1.0) > share) column.of[2].value[i] += 0.3;
    }
    const auto findings = check_columns(sites_of(3), {column});
    CHECK(findings.empty() != found);
    if (!found) continue;
    const auto finding = only(findings);
    CHECK(finding.fault == Fault::twin_series);
    CHECK(finding.station == "A");
    CHECK(finding.first == "2001-01-01");
    CHECK(finding.sentence.find("stations 'A' and 'C', column 'tas'") == 0);
  }
  // Days on which both are dry say nothing: here rain falls on fewer than 365 days.
  auto dry = rain(2);
  for (std::size_t i = 0; i < dry.of[0].value.size(); ++i) {
    if (i % 9 != 0) dry.of[0].value[i] = 0;
  }
  dry.of[1] = dry.of[0];
  CHECK(check_columns(sites_of(2), {dry}).empty());
}

TEST_CASE("a real pair: two stations of one place share their precipitation, and nothing else is wrong with them") {
  // Records of the US cooperative network (testdata/PROVENANCE.md). Counted apart from this code: of the months both
  // have, all precipitation is equal, and 3 to 8 percent of the temperatures.
  std::ifstream in(std::string(WINDROW_TESTDATA) + "/colorado/pine_bluffs_monthly.csv", std::ios::binary);
  REQUIRE(in.good());
  std::string header;
  std::getline(in, header);
  REQUIRE(header == "id,year,month,tmin_degC,tmax_degC,precip_mm");
  std::ostringstream bytes;
  bytes << "station,year,month,tmin [degC],tmax [degC],precip [mm/month]\n" << in.rdbuf();
  const auto finding = only(check_table(text::CsvTable::parse(bytes.str(), "pine_bluffs_monthly.csv")));
  CHECK(finding.fault == Fault::twin_series);
  CHECK(finding.column == "precip");
  CHECK(finding.first == "1961-01");
  CHECK(finding.sentence.find("stations '487235' and '487240'") == 0);
}

TEST_CASE("one value on ten days in a row is stuck; nine, zeros, and days apart are not") {
  const auto planted = [](std::size_t length, double value, bool gap) {
    auto column = temperatures(1);
    for (std::size_t i = 0; i < length; ++i) column.of[0].value[100 + i] = value;
    if (gap) {
      column.of[0].date.erase(column.of[0].date.begin() + 105);
      column.of[0].value.erase(column.of[0].value.begin() + 105);
    }
    return check_columns(sites_of(1), {column});
  };
  const auto finding = only(planted(10, 21.5, false));
  CHECK(finding.fault == Fault::stuck);
  CHECK(finding.first == "2001-04-11");
  CHECK(finding.count == 10);
  CHECK(finding.sentence == "station 'A', column 'tas': 21.5 on 10 days in a row from 2001-04-11");
  CHECK(planted(9, 21.5, false).empty());
  CHECK(planted(10, 0, false).empty());
  CHECK(planted(12, 21.5, true).empty());
  auto wet = rain(1);
  for (std::size_t i = 0; i < 7; ++i) wet.of[0].value[200 + i] = 0.4;
  wet.of[0].value[199] = wet.of[0].value[207] = 0;
  CHECK(only(check_columns(sites_of(1), {wet})).count == 7);
}

TEST_CASE("a whole station in another unit is found against its neighbours") {
  const std::vector<std::pair<std::function<double(double)>, std::string>> faults{
      {fahrenheit, "degF in a column of degC"},
      {[](double x) { return x + 273.15; }, "K in a column of degC"},
      {[](double x) { return 10 * x; }, "tenths of degC"},
      {[](double x) { return x / 10; }, "ten times too small"}};
  for (const auto& [change, said] : faults) {
    const std::string& text = said;
    CAPTURE(text);
    auto column = temperatures(5);
    plant(column.of[2], 2001, 2008, change);
    const auto finding = only(check_columns(sites_of(5), {column}));
    CHECK(finding.fault == Fault::units);
    CHECK(finding.count == 2922);
    CHECK(finding.sentence ==
          "station 'C', column 'tas': all 2922 values from 2001-01-01 to 2008-12-31 look like " + text);
  }
  const std::vector<std::pair<double, std::string>> amounts{
      {10, "tenths of mm"}, {1 / 25.4, "inches in a column of mm"}, {0.1, "cm in a column of mm"}};
  for (const auto& [factor, said] : amounts) {
    const std::string& text = said;
    CAPTURE(text);
    auto column = rain(5);
    for (double& x : column.of[2].value) x *= factor;
    CHECK(only(check_columns(sites_of(5), {column})).sentence.ends_with("look like " + text));
  }
}

TEST_CASE("a stretch of years in another unit is found with its first day and number, with and without neighbours") {
  for (const std::size_t stations : {1U, 5U}) {
    CAPTURE(stations);
    auto column = temperatures(stations);
    plant(column.of[0], 2004, 2005, fahrenheit);
    const auto finding = only(check_columns(sites_of(stations), {column}));
    CHECK(finding.station == "A");
    CHECK(finding.first == "2004-01-01");
    CHECK(finding.count == 731);
    CHECK(finding.sentence ==
          "station 'A', column 'tas': the 731 values from 2004-01-01 to 2005-12-31 look like degF in a column of degC");
    auto wet = rain(stations);
    plant(wet.of[0], 2003, 2005, [](double x) { return x / 25.4; });
    CHECK(only(check_columns(sites_of(stations), {wet})).count == 1096);
  }
}

TEST_CASE("a single station wholly in another unit is found where no place on Earth has such values") {
  auto column = temperatures(1);
  plant(column.of[0], 2001, 2008, fahrenheit);
  CHECK(only(check_columns(sites_of(1), {column})).sentence.ends_with("look like degF in a column of degC"));
  auto wet = rain(1);
  for (double& x : wet.of[0].value) x /= 25.4;
  CHECK(only(check_columns(sites_of(1), {wet})).sentence.ends_with("look like inches in a column of mm"));
}

TEST_CASE("days with the lowest above the highest temperature are counted; mostly so is a swap") {
  auto lowest = temperatures(2, 5, "tmin"), highest = temperatures(2, 5, "tmax");
  for (auto& series : highest.of) {
    for (double& x : series.value) x += 8;
  }
  std::swap(lowest.of[0].value[40], highest.of[0].value[40]);
  std::swap(lowest.of[1].value, highest.of[1].value);
  const auto findings = check_columns(sites_of(2), {lowest, highest});
  REQUIRE(findings.size() == 2);
  CHECK(findings[0].sentence == "station 'A': 'tmin' is above 'tmax' on 1 of 2922 days (from 2001-02-10)");
  CHECK(findings[1].sentence ==
        "station 'B': 'tmin' is above 'tmax' on 2922 of 2922 days (from 2001-01-01); the columns seem to be swapped");
  CHECK(findings[1].fault == Fault::swapped);
}

TEST_CASE("a station that stands among the others with its longitude turned is told; a far one is not") {
  auto sites = sites_of(6);
  sites[4].position.longitude = Angle::degrees(-sites[4].position.longitude.degrees());
  const auto finding = only(check_positions(sites));
  CHECK(finding.station == "E");
  CHECK(finding.fault == Fault::longitude_sign);
  sites[4].position.longitude = Angle::degrees(80);
  CHECK(check_positions(sites).empty());
  // A network as sparse as the far station's distance says nothing.
  for (std::size_t i = 0; i < sites.size(); ++i) {
    sites[i].position = {Angle::degrees(-160 + 55 * double(i)), Angle::degrees(i % 2 == 0 ? 40 : -30)};
  }
  CHECK(check_positions(sites).empty());
}

TEST_CASE("an elevation far from the relief is told, with feet where they would fit") {
  auto sites = sites_of(4);
  sites[1].elevation_m = 900;
  sites[2].elevation_m = 3000;
  sites[3].elevation_m = std::numeric_limits<double>::quiet_NaN();
  const auto findings = check_elevations(sites, {150, 200, 920, 100});
  REQUIRE(findings.size() == 2);
  CHECK(findings[0].sentence ==
        "station 'B' has the elevation 900 m where the relief has 200 m; read as feet it would fit");
  CHECK(findings[1].sentence ==
        "station 'C' has the elevation 3000 m where the relief has 920 m; read as feet it would fit");
  CHECK(check_elevations(sites, {150, 200, 920, 100}, 3000).empty());
  sites[1].elevation_m = 1900;
  CHECK(check_elevations(sites, {150, 200, 920, 100})[0].sentence ==
        "station 'B' has the elevation 1900 m where the relief has 200 m");
}

TEST_CASE("a gauge's resolution is the smallest step of its values, whatever their representation") {
  CHECK(resolution_of(rain(1).of[0].value) == doctest::Approx(0.1).epsilon(1e-9));
  std::vector<double> half, single;
  for (int i = 0; i < 60; ++i) half.push_back(0.5 * (i % 30));
  CHECK(resolution_of(half) == 0.5);
  for (const double x : rain(1).of[0].value) single.push_back(double(float(x)));
  CHECK(resolution_of(single) == doctest::Approx(0.1).epsilon(1e-4));
  CHECK(std::isnan(resolution_of(std::vector<double>(19, 0.2))));
  CHECK(std::isnan(resolution_of(std::vector<double>(500, 0.0))));
}

TEST_CASE("of a kind five findings are told by name, then their number") {
  Notices notices;
  std::vector<Finding> findings;
  for (int i = 0; i < 8; ++i) findings.push_back({"A", "tas", Fault::stuck, "", 10, "stretch " + std::to_string(i)});
  findings.push_back({"A", "", Fault::elevation, "", 1, "high"});
  tell(findings, "d.csv", notices);
  const auto list = notices.list();
  REQUIRE(list.size() == 7);
  CHECK(list[4] == Notice{"d.csv", "stretch 4"});
  CHECK(list[5] == Notice{"d.csv", "high"});
  CHECK(list[6] == Notice{"d.csv", "3 more stretches of one value"});
}

}  // namespace windrow::station
