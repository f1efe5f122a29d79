// What files of stations become, and what is refused. All values are invented. The layouts against one another and
// against CSV: tests/reference/station_files.py.
#include "windrow/cf/stations.h"

#include "file_builder.h"

namespace windrow::cf {
namespace {

using cftest::error_text;
using cftest::FileBuilder;

/// Two stations with whole numbers for identifiers; what follows is added by the test.
FileBuilder stations(const std::string& name, const std::string& feature = "timeSeries") {
  FileBuilder file(name);
  file.dim("station", 2).dim("time", 3).dim("two", 2);
  file.global().att("featureType", feature);
  file.var("num", NC_INT, {"station"}, {101, 102}).att("cf_role", "timeseries_id");
  file.var("lat", NC_FLOAT, {"station"}, {48.2F, 49}).att("units", "degrees_north");
  file.var("lon", NC_FLOAT, {"station"}, {-28.5, -27}).att("units", "degrees_east");
  return file;
}

FileBuilder& times(FileBuilder& file, const std::vector<double>& values, const std::string& calendar = "standard") {
  return file.var("time", NC_DOUBLE, {"time"}, values).att("units", "days since 2001-02-27").att("calendar", calendar);
}

std::vector<std::string> lines(const text::CsvTable& table) {
  std::vector<std::string> out;
  for (std::size_t row = 0; row < table.rows(); ++row) {
    std::string line;
    for (std::size_t c = 0; c < table.headings().size(); ++c)
      line += (c > 0 ? "," : "") + std::string(table.at(row, c));
    out.push_back(line);
  }
  return out;
}

using Lines = std::vector<std::string>;

}  // namespace

TEST_CASE("a file of stations becomes the tables of sites and days; a float keeps its shortest decimals") {
  auto file = stations("plain.nc");
  times(file, {0, 1, 2});
  file.var("alt", NC_FLOAT, {"station"}, {0.34F, 1.2F}).att("standard_name", "surface_altitude").att("units", "km");
  file.var("tas", NC_FLOAT, {"station", "time"}, {1.1F, -9, 3, 4, 5, -9})
      .att("_FillValue", NC_FLOAT, {-9})
      .att("units", "degC");
  file.var("pr", NC_FLOAT, {"time", "station"}, {0, 1, 2, 3, 4, 5}).att("units", "mm");
  const std::string path = file.done();
  Notices notices;
  const auto values = read_station_values(path, StationSpan::day, {"tas"}, notices);
  CHECK_FALSE(values.hours_known);
  CHECK(values.table.headings()[2].name == "tas");
  CHECK(values.table.headings()[2].units == "degC");
  CHECK(values.table.headings()[3].name == "pr");
  CHECK(lines(values.table) ==
        Lines{"101,2001-02-27,1.1,", "101,2001-03-01,3,", "102,2001-02-27,4,", "102,2001-02-28,5,"});
  CHECK(values.table.place(1) == path + ": time 3");
  const auto all = read_station_values(path, StationSpan::day, {}, notices).table;
  CHECK(lines(all) == Lines{"101,2001-02-27,1.1,0", "101,2001-02-28,,2", "101,2001-03-01,3,4", "102,2001-02-27,4,1",
                            "102,2001-02-28,5,3", "102,2001-03-01,,5"});
  const auto sites = read_station_sites({path, path}, notices);
  REQUIRE(sites.rows() == 2);
  CHECK(lines(sites)[0].starts_with("101,-28.5,48.2,340.0000"));
  CHECK(has_stations(path));
  CHECK(notices.list().empty());
}

TEST_CASE("a single station may have no dimension; months go by the middle of their bounds") {
  FileBuilder file("single.nc");
  file.dim("time", 2).dim("two", 2).dim("length", 6);
  file.var("name", NC_CHAR, {"length"}, {}).att("cf_role", "timeseries_id");
  file.var("lat", NC_DOUBLE, {}, {48}).att("standard_name", "latitude");
  file.var("lon", NC_DOUBLE, {}, {11}).att("standard_name", "longitude");
  file.var("time", NC_DOUBLE, {"time"}, {31, 59}).att("units", "days since 2001-01-01").att("bounds", "tb");
  file.var("tb", NC_DOUBLE, {"time", "two"}, {0, 31, 31, 59});
  file.var("tas", NC_DOUBLE, {"time"}, {1.25, 2.5}).att("units", "degC");
  const std::string path = file.done();
  Notices notices;
  const auto values = read_station_values(path, StationSpan::month, {}, notices);
  CHECK(values.hours_known);
  CHECK(lines(values.table) == Lines{",2001,1,1.25", ",2001,2,2.5"});
  CHECK(lines(read_station_sites({path}, notices)) == Lines{",11,48,,"});
  CHECK(error_text(Failure::data, [&] { read_station_values(path, StationSpan::day, {}, notices); }) ==
        "single.nc: time: the time bounds at position 0 span 31 days; expected a day");
}

TEST_CASE("a height above the surface is no elevation, and that is said") {
  auto file = stations("height.nc");
  times(file, {0, 1, 2});
  file.var("alt", NC_FLOAT, {"station"}, {2, 2}).att("standard_name", "height").att("units", "m");
  const std::string path = file.done();
  Notices notices;
  CHECK(lines(read_station_sites({path}, notices))[1] == "102,-27,49,,");
  CHECK(notices.list() ==
        std::vector{Notice{path, "'alt' has the standard name height and is not taken for the stations' elevation"}});
}

TEST_CASE("what is no file of daily observations is refused with what was expected") {
  Notices notices;
  const auto failure = [&](FileBuilder& file) {
    const std::string path = file.done();
    return error_text(Failure::data, [&] {
      read_station_values(path, StationSpan::day, {}, notices);
      read_station_sites({path}, notices);
    });
  };
  auto profile = stations("a.nc", "profile");
  CHECK(failure(times(profile, {0, 1, 2})) ==
        "a.nc: featureType is 'profile'; observations at stations need timeSeries");
  auto timeless = stations("b.nc");
  CHECK(failure(timeless) ==
        "b.nc: no time of the observations; expected a variable with units such as \"days since 1961-01-01\"");
  auto noleap = stations("c.nc");
  times(noleap, {0, 1, 2}, "noleap");
  CHECK(failure(noleap) == "c.nc: time: the calendar is noleap; observations need standard or proleptic_gregorian");
  auto hourly = stations("d.nc");
  times(hourly, {0, 0.25, 0.5});
  CHECK(failure(hourly.var("tas", NC_FLOAT, {"station", "time"}, {1, 2, 3, 4, 5, 6}).att("units", "K")) ==
        "d.nc: station '101' has values of several times of 2001-02-27; expected one a day");
  auto counts = stations("e.nc");
  counts.var("rows", NC_INT, {"station"}, {1, 1}).att("sample_dimension", "time");
  CHECK(failure(times(counts, {0, 1, 2})) == "e.nc: 'rows' counts 2 samples; the dimension 'time' has 3");
  auto index = stations("f.nc");
  index.var("which", NC_INT, {"time"}, {0, 1, 2}).att("instance_dimension", "station");
  CHECK(failure(times(index, {0, 1, 2})) == "f.nc: 'which' names station 2 at position 2; there are 2, counted from 0");
  FileBuilder nowhere("g.nc");
  nowhere.dim("station", 2).dim("time", 3);
  nowhere.var("num", NC_INT, {"station"}, {1, 2}).att("cf_role", "timeseries_id");
  CHECK(failure(times(nowhere, {0, 1, 2})) ==
        "g.nc: no longitude of the stations; expected a variable of one value a station with units degrees_east");
}

}  // namespace windrow::cf
