// Laws of station reading: what is kept, what is left out and how it is told. All tables but the excerpts are invented.
#include "windrow/station/station.h"

#include <doctest/doctest.h>

#include <cmath>
#include <fstream>
#include <random>
#include <sstream>

#include "windrow/base/error.h"

namespace windrow::station {
namespace {

const char* const kSites =
    "station,longitude,latitude,elevation,name\n"
    "a1,-28.5,48.25,120,Kelder North\n"
    "b2,-27.5,48.75,340,Kelder South\n";

text::CsvTable table(const std::string& text, const std::string& file) { return text::CsvTable::parse(text, file); }

text::CsvTable excerpt(const std::string& name) {
  std::ifstream in(std::string(WINDROW_TESTDATA) + "/colorado/" + name, std::ios::binary);
  REQUIRE(in.good());
  std::ostringstream bytes;
  bytes << in.rdbuf();
  return table(bytes.str(), name);
}

Options tas() {
  Options o;
  o.observed = {"tas"};
  o.units = "degC";
  o.low = -90;
  o.high = 60;
  o.min_years = 1;
  return o;
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

/// Twelve months of one value for each of the stations.
std::string monthly_rows(const std::string& header, const std::vector<std::string>& ids, int first, int last,
                         const std::string& value) {
  std::string text = header + "\n";
  for (const auto& id : ids) {
    for (int y = first; y <= last; ++y) {
      for (int m = 1; m <= 12; ++m) {
        text += id + "," + std::to_string(y) + "," + std::to_string(m) + "," + value + "\n";
      }
    }
  }
  return text;
}

std::string daily_rows(const std::string& header, const std::string& id, int first, int last,
                       const std::string& value) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "test");
  std::string text = header + "\n";
  const auto end = gregorian.day_number({last, 12, 31});
  for (auto day = gregorian.day_number({first, 1, 1}); day <= end; ++day) {
    text += id + "," + calendar::to_string(gregorian.date(day)) + "," + value + "\n";
  }
  return text;
}

std::string replaced(std::string text, const std::string& from, const std::string& to) {
  const auto at = text.find(from);
  REQUIRE(at != std::string::npos);
  return text.replace(at, from.size(), to);
}

bool told(const Notices& notices, const Notice& wanted) {
  for (const Notice& n : notices.list()) {
    if (n == wanted) return true;
  }
  for (const Notice& n : notices.list()) MESSAGE("told: " << n.place << ": " << n.text);
  return false;
}

std::vector<Record> read(const Tables& tables, const Options& options, Notices& notices, const Mapping& mapping = {}) {
  return read_records(tables, mapping, options, notices);
}

std::string failure(const Tables& tables, const Options& options, const Mapping& mapping = {}) {
  Notices notices;
  try {
    read_records(tables, mapping, options, notices);
  } catch (const Error& e) {
    CHECK(e.kind() == Failure::data);
    return e.what();
  }
  return "no error";
}

}  // namespace

TEST_CASE("completeness of months follows WMO-No. 1203 (2017), section 4.4") {
  // Through a stored summary of the guideline (secondary source): means are rejected with 11 or more days missing or 5
  // or more consecutive ones; sums with any day missing.
  const auto month = [](std::initializer_list<int> missing) {
    std::vector<bool> present(30, true);
    for (const int day : missing) present[static_cast<std::size_t>(day - 1)] = false;
    return present;
  };
  CHECK(month_complete(month({}), Kind::mean));
  CHECK(month_complete(month({}), Kind::sum));
  CHECK(month_complete(month({1, 3, 5, 7, 9, 11, 13, 15, 17, 19}), Kind::mean));            // 10 missing
  CHECK_FALSE(month_complete(month({1, 3, 5, 7, 9, 11, 13, 15, 17, 19, 21}), Kind::mean));  // 11 missing
  CHECK(month_complete(month({4, 5, 6, 7}), Kind::mean));                                   // 4 in a row
  CHECK_FALSE(month_complete(month({4, 5, 6, 7, 8}), Kind::mean));                          // 5 in a row
  CHECK_FALSE(month_complete(month({26, 27, 28, 29, 30}), Kind::mean));                     // at the end too
  CHECK_FALSE(month_complete(month({17}), Kind::sum));
  CHECK_FALSE(month_complete({}, Kind::mean));
  CHECK(months_needed(30) == 24);
  CHECK(months_needed(10) == 8);
  CHECK(months_needed(11) == 9);
  CHECK(months_needed(1) == 1);
}

TEST_CASE("normals need 80 percent of the years, month by month") {
  std::vector<MonthlyValue> monthly;
  for (int y = 1961; y <= 1984; ++y) monthly.push_back({y, 1, static_cast<double>(y)});
  for (int y = 1961; y <= 1983; ++y) monthly.push_back({y, 2, 5});
  for (int y = 1991; y <= 2020; ++y) monthly.push_back({y, 3, 5});
  const auto normals = normals_of(monthly, 1961, 1990);
  REQUIRE(normals.size() == 12);
  CHECK(normals[0] == 1972.5);
  CHECK(std::isnan(normals[1]));
  CHECK(std::isnan(normals[2]));
  CHECK(normals_of(monthly, 1901, 1930).empty());
}

TEST_CASE("daily series keep complete months only and give monthly values") {
  std::string text = daily_rows("station,date,tas [K]", "a1", 2001, 2003, "283.15");
  for (int d = 10; d <= 14; ++d)
    text = replaced(text, "2002-03-" + std::to_string(d) + ",283.15", "2002-03-" + std::to_string(d) + ",NA");
  for (int d = 10; d <= 13; ++d)
    text = replaced(text, "2003-03-" + std::to_string(d) + ",283.15", "2003-03-" + std::to_string(d) + ",");
  text = replaced(text, "2003-03-20,283.15", "2003-03-20,293.15");
  Notices notices;
  const auto records = read({table(kSites, "sites.csv"), {table(text, "daily.csv")}, {}, {}}, tas(), notices);
  REQUIRE(records.size() == 1);
  CHECK(records[0].site.id == "a1");
  CHECK(records[0].site.name == "Kelder North");
  CHECK(records[0].site.elevation_m == 120);
  CHECK(records[0].daily.day.size() == 3 * 365 - 31 - 4);
  CHECK(records[0].monthly.size() == 35);
  CHECK(records[0].complete_years == 2);
  CHECK(records[0].daily.value[0] == doctest::Approx(10).epsilon(1e-12));
  const MonthlyValue march = records[0].monthly[25];
  CHECK(march.year == 2003);
  CHECK(march.month == 3);
  CHECK(march.value == doctest::Approx(10 + 10.0 / 27).epsilon(1e-12));
  CHECK(records[0].normal.empty());
  CHECK(told(notices, {"daily.csv", "1 of 36 station months are incomplete and left out (WMO-No. 1203, 4.4)"}));
  CHECK(told(notices, {"sites.csv", "station 'b2' has no value and is left out"}));
}

TEST_CASE("sums need every day; a depth a day is a rate, a depth a month is divided by the month's true length") {
  std::string text = daily_rows("station,date,pr [mm]", "a1", 2001, 2002, "3");
  text = replaced(text, "2001-06-10,3", "2001-06-10,");
  Notices notices;
  const auto daily = read({table(kSites, "s.csv"), {table(text, "d.csv")}, {}, {}}, rain(), notices);
  REQUIRE(daily.size() == 1);
  CHECK(daily[0].monthly.size() == 23);
  CHECK(daily[0].monthly[0].value == doctest::Approx(3).epsilon(1e-12));
  for (const char* heading : {"station,year,month,pr [mm/month]", "station,year,month,pr [mm]",
                              "station,year,month,pr [cm month-1]", "station,year,month,pr [kg m-2]"}) {
    const auto months =
        read({table(kSites, "s.csv"), {}, {table(monthly_rows(heading, {"a1"}, 2003, 2004, "58"), "m.csv")}, {}},
             rain(), notices);
    REQUIRE(months.size() == 1);
    const double factor = std::string(heading).find("cm") == std::string::npos ? 1 : 10;
    CHECK(months[0].monthly[0].value == doctest::Approx(factor * 58 / 31).epsilon(1e-12));
    CHECK(months[0].monthly[1].value == doctest::Approx(factor * 58 / 28).epsilon(1e-12));
    CHECK(months[0].monthly[13].value == doctest::Approx(factor * 58 / 29).epsilon(1e-12));
  }
  std::string normals = "station,month,pr [mm/month]\n";
  for (int m = 1; m <= 12; ++m) normals += "a1," + std::to_string(m) + ",58\n";
  Options leap = rain();
  leap.normals_first = 2004;
  leap.normals_last = 2004;
  const Tables tables{table(kSites, "s.csv"), {}, {}, {table(normals, "n.csv")}};
  CHECK(read(tables, leap, notices)[0].normal[1] == doctest::Approx(2).epsilon(1e-12));
  CHECK(read(tables, rain(), notices)[0].normal[1] == doctest::Approx(58 / 28.2425).epsilon(1e-12));
}

TEST_CASE("two columns are averaged where both are present") {
  Options options = tas();
  options.observed = {"tmin", "tmax"};
  const std::string text = "station,year,month,tmin [degC],tmax [degF]\na1,2001,1,0,50\na1,2001,2,0,\na1,2001,3,,50\n";
  Mapping mapping;
  options.min_years = 0;
  Notices notices;
  const auto records = read({table(kSites, "s.csv"), {}, {table(text, "m.csv")}, {}}, options, notices, mapping);
  REQUIRE(records.size() == 1);
  REQUIRE(records[0].monthly.size() == 1);
  CHECK(records[0].monthly[0].value == doctest::Approx(5).epsilon(1e-12));
  const std::string one = "station,year,month,tmin [degC],tmx [degC]\na1,2001,1,0,10\n";
  CHECK(failure({table(kSites, "s.csv"), {}, {table(one, "m.csv")}, {}}, options) ==
        "m.csv: no column 'tmax'; did you mean 'tmx'?");
}

TEST_CASE("impossible values are left out by name and line, five in detail") {
  std::string text = monthly_rows("station,year,month,tas [degC]", {"a1"}, 2001, 2003, "7");
  text = replaced(text, "2001,2,7", "2001,2,-999");
  Notices notices;
  auto records = read({table(kSites, "s.csv"), {}, {table(text, "m.csv")}, {}}, tas(), notices);
  REQUIRE(records.size() == 1);
  CHECK(records[0].monthly.size() == 35);
  CHECK(told(notices, {"m.csv:3", "station 'a1', column 'tas': -999 is -999 degC, outside -90 to 60; it is left out"}));
  text = monthly_rows("station,year,month,tas [degC]", {"a1"}, 2001, 2003, "99");
  Notices many;
  records = read({table(kSites, "s.csv"), {}, {table(text, "m.csv")}, {}}, tas(), many);
  CHECK(records.empty());
  CHECK(told(many, {"m.csv", "31 more impossible values left out"}));
}

TEST_CASE("a date given twice: equal values are one, different ones none") {
  std::string text = monthly_rows("station,year,month,tas [degC]", {"a1"}, 2001, 2002, "7");
  text += "a1,2001,5,7\na1,2001,6,8\n";
  Notices notices;
  const auto records = read({table(kSites, "s.csv"), {}, {table(text, "m.csv")}, {}}, tas(), notices);
  REQUIRE(records.size() == 1);
  CHECK(records[0].monthly.size() == 23);
  CHECK(records[0].complete_years == 1);
  CHECK(told(notices, {"m.csv", "1 rows repeat a station and date with the same value; one of each is kept"}));
  CHECK(told(notices, {"m.csv:27",
                       "station 'a1' has 2001-06 more than once with different values (first at m.csv:7); all are left "
                       "out"}));
}

TEST_CASE("odd sites are told: twice, nowhere, at one position, without elevation") {
  const std::string sites =
      "station,longitude,latitude,elevation,name\n"
      "a1,10,50,120,A\na1,10,50,120,A\n"
      "b2,11,51,10,B\nb2,11,51.5,10,B\n"
      "c3,,51,10,C\nd4,12,95,10,D\n"
      "e5,13,50,,E\nf6,13,50,40,F\n";
  const auto rows = monthly_rows("station,year,month,tas [degC]", {"a1", "b2", "e5", "f6"}, 2001, 2001, "7");
  Notices notices;
  const auto records = read({table(sites, "s.csv"), {}, {table(rows, "m.csv")}, {}}, tas(), notices);
  REQUIRE(records.size() == 3);
  CHECK(records[0].site.id == "a1");
  CHECK(std::isnan(records[1].site.elevation_m));
  CHECK(told(notices, {"s.csv:3", "station 'a1' stands twice; one is kept"}));
  CHECK(told(notices, {"s.csv:5", "station 'b2' stands twice with different positions; both are left out"}));
  CHECK(told(notices, {"s.csv:6", "station 'c3' has no coordinates and is left out"}));
  CHECK(told(notices, {"s.csv:7", "station 'd4' at longitude 12, latitude 95 is on no globe and is left out"}));
  CHECK(told(notices, {"s.csv", "stations 'e5' and 'f6' stand at the same position; both are used"}));
  CHECK(told(notices, {"s.csv", "station 'e5' has no elevation; nothing that needs heights can use it"}));
  CHECK(told(notices, {"m.csv", "station 'b2' has values but no site; it is left out"}));
}

TEST_CASE("too few complete years: left out, or normals alone, or the longer monthly series") {
  Options options = tas();
  options.min_years = 3;
  const auto daily = table(daily_rows("station,date,tas [degC]", "a1", 2001, 2002, "7"), "d.csv");
  Notices notices;
  CHECK(read({table(kSites, "s.csv"), {daily}, {}, {}}, options, notices).empty());
  CHECK(told(notices, {"station 'a1'", "2 complete years (fewest in January), at least 3 are needed; it is left out"}));
  std::string normals = "station,month,tas [degC]\n";
  for (int m = 2; m <= 12; ++m) normals += "a1," + std::to_string(m) + ",5\n";
  const auto with_normals = read({table(kSites, "s.csv"), {daily}, {}, {table(normals, "n.csv")}}, options, notices);
  REQUIRE(with_normals.size() == 1);
  CHECK(with_normals[0].daily.day.empty());
  CHECK(with_normals[0].monthly.empty());
  CHECK(with_normals[0].complete_years == 0);
  CHECK(std::isnan(with_normals[0].normal[0]));
  CHECK(with_normals[0].normal[1] == 5);
  CHECK(told(notices, {"station 'a1'",
                       "2 complete years (fewest in January), at least 3 are needed; only its normals are used"}));
  const auto monthly = table(monthly_rows("station,year,month,tas [degC]", {"a1"}, 1991, 1999, "6"), "m.csv");
  const auto longer = read({table(kSites, "s.csv"), {daily}, {monthly}, {}}, options, notices);
  REQUIRE(longer.size() == 1);
  CHECK(longer[0].daily.day.empty());
  CHECK(longer[0].complete_years == 9);
}

TEST_CASE("what cannot be read names file, line, what is wrong and what to do") {
  const auto sites = table(kSites, "s.csv");
  const auto monthly = [](const std::string& text) { return std::vector{table(text, "m.csv")}; };
  const auto daily = [](const std::string& text) { return std::vector{table(text, "d.csv")}; };
  const std::string m = "station,year,month,tas [degC]\n", d = "station,date,tas [degC]\n";
  CHECK(failure({sites, {}, monthly(m + "a1,2001,1,warm\n"), {}}, tas()) ==
        "m.csv:2: column 'tas': 'warm' is not a number; a missing value is left empty, NA or NaN");
  CHECK(failure({sites, {}, monthly(m + "a1,2001,13,7\n"), {}}, tas()) ==
        "m.csv:2: column 'month': '13'; expected a whole number from 1 to 12");
  CHECK(failure({sites, daily(d + "a1,2001-13-01,7\n"), {}, {}}, tas()).substr(0, 8) == "d.csv:2:");
  CHECK(failure({sites, daily(d + "a1,2001-02-29,7\n"), {}, {}}, tas()) ==
        "d.csv:2: '2001-02-29' is no day of the calendar");
  CHECK(failure({sites, daily(d + ",2001-02-28,7\n"), {}, {}}, tas()) ==
        "d.csv:2: no station; expected its identifier");
  CHECK(failure({sites, daily(d), {}, {}}, tas()) == "d.csv: no rows; expected one for each station and date");
  CHECK(failure({table("station,longitude,latitude\n", "s.csv"), daily(d), {}, {}}, tas()) ==
        "s.csv: no rows; expected one for each station");
  CHECK(failure({sites, daily("station,date,taz [degC]\na1,2001-01-01,7\n"), {}, {}}, tas()) ==
        "d.csv: no column 'tas'; did you mean 'taz'?");
  CHECK(failure({table("id,lon,lat\na1,1,2\n", "s.csv"), daily(d), {}, {}}, tas()) ==
        "s.csv: no column 'station'; set columns = { station = \"...\" } in [stations]; it has id, lon, lat");
  CHECK(failure({sites, daily("station,date,tas\na1,2001-01-01,7\n"), {}, {}}, tas()) ==
        "d.csv: column 'tas': no units; expected a heading 'tas [degC]' or units = { tas = \"degC\" } in [stations]");
  CHECK(failure({sites, daily("station,date,tas [hPa]\na1,2001-01-01,7\n"), {}, {}}, tas()) ==
        "d.csv: column 'tas': units 'hPa' cannot be converted to 'degC'");
  CHECK(failure({sites, daily("station,date,tas [grad]\na1,2001-01-01,7\n"), {}, {}}, tas()) ==
        "d.csv: column 'tas': units 'grad' are not known to UDUNITS");
  CHECK(failure({sites, daily("station,date,pr [mm/month]\na1,2001-01-01,7\n"), {}, {}}, rain()) ==
        "d.csv: column 'pr': units 'mm/month' in a table of days; expected an amount or a rate");
  CHECK(failure({sites, {}, {}, {}}, tas()) ==
        "s.csv: sites without values; expected daily, monthly or normals in [stations]");
}

TEST_CASE("a cooperative network's tables are read through a mapping; normals agree with those made independently") {
  Mapping mapping;
  mapping.columns = {{"station", "id"},     {"longitude", "lon"},  {"latitude", "lat"}, {"elevation", "elev_m"},
                     {"tmin", "tmin_degC"}, {"tmax", "tmax_degC"}, {"pr", "precip_mm"}};
  mapping.units = {{"tmin_degC", "degC"}, {"tmax_degC", "degC"}, {"precip_mm", "mm/month"}};
  Options options = tas();
  options.observed = {"tmin", "tmax"};
  options.min_years = 10;
  Tables tables{excerpt("raw_sites.csv"), {}, {excerpt("raw_monthly.csv")}, {}};
  Notices notices;
  const auto records = read(tables, options, notices, mapping);
  REQUIRE(records.size() == 3);
  CHECK(records[1].site.id == "050114");
  CHECK(records[1].site.name == "AKRON WASHIN");
  CHECK(records[1].site.elevation_m == 1398);
  // normals.csv beside it was made by a script from the same source, to two decimals.
  const text::CsvTable normals = excerpt("normals.csv");
  int compared = 0;
  for (const Record& record : records) {
    const auto made = normals_of(record.monthly, 1961, 1990);
    for (std::size_t row = 0; row < normals.rows(); ++row) {
      if (normals.at(row, 0) != record.site.id) continue;
      REQUIRE(made.size() == 12);
      const auto month = static_cast<std::size_t>(std::stoi(std::string(normals.at(row, 1))));
      CHECK(std::abs(made[month - 1] - std::stod(std::string(normals.at(row, 2)))) < 0.005 + 1e-9);
      ++compared;
    }
  }
  CHECK(compared == 24);
  Options precipitation = rain();
  precipitation.min_years = 10;
  const auto wet = read(tables, precipitation, notices, mapping);
  REQUIRE(wet.size() == 3);
  CHECK(wet[2].site.id == "050848");
}

TEST_CASE("tables of daily observations with other headings and units in the job file are read") {
  Mapping mapping;
  mapping.columns = {{"tmin", "tmin_degC"}, {"tmax", "tmax_degC"}};
  mapping.units = {{"tmin_degC", "degC"}, {"tmax_degC", "degC"}};
  std::string text = "station,date,tmin_degC,tmax_degC,precip_mm,wind_m_s\n";
  for (int d = 1; d <= 31; ++d)
    text += "a1,2012-01-" + std::string(d < 10 ? "0" : "") + std::to_string(d) + ",5.0,12.8,0.0,4.7\n";
  Options options = tas();
  options.observed = {"tmin", "tmax"};
  options.min_years = 0;
  Notices notices;
  const auto records = read({table(kSites, "s.csv"), {table(text, "d.csv")}, {}, {}}, options, notices, mapping);
  REQUIRE(records.size() == 1);
  CHECK(records[0].daily.day.size() == 31);
  CHECK(records[0].daily.day[0] == calendar::Calendar::from_cf("proleptic_gregorian", "").day_number({2012, 1, 1}));
  CHECK(records[0].daily.value[0] == doctest::Approx(8.9).epsilon(1e-12));
}

TEST_CASE("a table without the field is passed over when another one has it") {
  const auto without = table("station,date,pr [mm]\na1,2001-01-01,7\n", "pr.csv");
  const auto with = table(daily_rows("station,date,tas [degC]", "a1", 2001, 2001, "7"), "tas.csv");
  Notices notices;
  CHECK(read({table(kSites, "s.csv"), {without, with}, {}, {}}, tas(), notices).size() == 1);
}

TEST_CASE("damaged tables are read or refused with an error, never worse") {
  const std::string good[] = {kSites, daily_rows("station,date,tas [degC]", "a1", 2001, 2001, "7").substr(0, 700),
                              monthly_rows("station,year,month,tas [degC]", {"a1", "b2"}, 2001, 2001, "6"),
                              "station,month,tas [degC]\na1,1,5\na1,2,NaN\n"};
  std::mt19937_64 random(77);
  const std::string bytes = "0123456789-.,;\"\n\r\t ean[]\xff";
  int refused = 0;
  constexpr int kRounds = 3000;
  for (int round = 0; round < kRounds; ++round) {
    std::string bad[] = {good[0], good[1], good[2], good[3]};
    for (int change = 0; change < 3; ++change) {
      std::string& text = bad[random() % 4];
      const auto at = static_cast<std::ptrdiff_t>(random() % text.size());
      const char byte = bytes[random() % bytes.size()];
      switch (random() % 3) {
        case 0:
          text[static_cast<std::size_t>(at)] = byte;
          break;
        case 1:
          text.insert(text.begin() + at, byte);
          break;
        default:
          text.erase(text.begin() + at);
      }
    }
    Notices notices;
    Options options = tas();
    options.min_years = static_cast<int>(random() % 2);
    try {
      const Tables tables{table(bad[0], "s"), {table(bad[1], "d")}, {table(bad[2], "m")}, {table(bad[3], "n")}};
      for (const Record& r : read_records(tables, {}, options, notices)) CHECK(!r.site.id.empty());
    } catch (const Error& e) {
      ++refused;
      CHECK(e.kind() == Failure::data);
      CHECK(std::string(e.what()).size() > 10);
    }
  }
  CHECK(refused > kRounds / 10);
  CHECK(refused < kRounds);
}

}  // namespace windrow::station
