// Stations in memory: sites, series, normals, completeness. Reads tables (text::CsvTable), knows no file system.
#pragma once
#include <cstdint>
#include <limits>
#include <map>
#include <string>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/base/notices.h"
#include "windrow/calendar/calendar.h"
#include "windrow/text/csv.h"

namespace windrow::station {

struct Site {
  std::string id;
  std::string name;
  GeoPoint position;
  double elevation_m = 0;  ///< NaN: not given
};

/// How headings and units of a user's file map to windrow's names (job file [stations] columns, units).
struct Mapping {
  std::map<std::string, std::string> columns;  ///< windrow's name -> heading in the file ("longitude" -> "lon"); a file
                                               ///< without that heading may still use windrow's name
  std::map<std::string, std::string> units;    ///< heading -> units, when the heading carries no [unit]
};

/// One observed variable of one station in output units. Days count from 0000-01-01, proleptic Gregorian.
struct DailySeries {
  std::vector<std::int64_t> day;  ///< strictly ascending, only days with a value
  std::vector<double> value;
};
struct MonthlyValue {
  int year = 0, month = 0;
  double value = 0;
};

/// What is known of one variable at one station after quality rules. A series (daily with the months made from it, or
/// monthly), normals, or both (normals win nothing when a series gives the season).
struct Record {
  Site site;
  DailySeries daily;                  ///< complete months only (WMO-No. 1203, 4.4)
  std::vector<MonthlyValue> monthly;  ///< complete months, ascending: given, or made from daily
  std::vector<double> normal;         ///< 12, NaN where missing; empty when there are none
  int complete_years = 0;             ///< of the series: most limiting calendar month's number of complete months
  /// Of daily sums: the gauge's, output units (quality.h, resolution_of); NaN: not known.
  double resolution = std::numeric_limits<double>::quiet_NaN();
};

/// Completeness rules of WMO-No. 1203 (2017), section 4.4 as summarised in the secondary source named in the tests.
enum class Kind { mean, sum };
/// Mean: rejected with >= 11 days missing or >= 5 consecutive days missing. Sum: rejected with any day missing.
bool month_complete(const std::vector<bool>& present, Kind kind);
/// Valid months needed for a normal over `years` years: 80 % (24 of 30).
int months_needed(int years);
/// Normals of first..last (years) from complete monthly values: 12 means over the years, NaN for a calendar month with
/// less than months_needed of them; empty when no month has enough.
std::vector<double> normals_of(const std::vector<MonthlyValue>& monthly, int first, int last);

struct Options {
  std::vector<std::string> observed;  ///< station columns; two are averaged (both must be present)
  std::string units;                  ///< output units of the field
  Kind kind = Kind::mean;
  bool per_day_rate = false;        ///< field is a rate (mm/day); monthly sums are divided by the month's length
  double low = -1e30, high = 1e30;  ///< impossible outside, in output units
  int min_years = 10;
  int normals_first = 0, normals_last = 0;  ///< normals_period, 0 when not given
  int day_shift = 0;                        ///< whole days added to the dates of daily tables whose hours are not known
  std::string undercatch;  ///< column of the sites table: factors that sums are multiplied by; empty: none
};

struct Tables {
  text::CsvTable sites;
  std::vector<text::CsvTable> daily, monthly, normals;
  std::vector<bool> hours_known = {};  ///< one a daily table: its dates come from the very hours; empty: none do
};

/// Builds the records of one field, in the order of the sites; empty when no station is left. A missing value is an
/// empty cell, NA or NaN. Left out and told through `notices` by name (at most 5 of a kind in detail, then their
/// number): a station and date twice with different values (the same value: one is kept, and it is said), a site twice
/// with different coordinates, impossible values, sites without coordinates or with impossible ones, values of stations
/// the sites table does not have. Told of every station: too few complete years for its series. Said, but used: two
/// sites at one position, a site without elevation. A daily series with enough complete years goes before a monthly
/// one. Units: of the heading's [bracket] or the mapping. Per month: divided by the month's true length against a rate
/// (in normals: its mean length over normals_period, or over 400 Gregorian years); an amount (mm) against a rate is
/// that of the day, or of the month. Elevations are metres unless units are given. Error(data) names file and line for
/// what cannot be read at all: bad date, bad number, unknown column (with the near miss), empty table, unknown or
/// missing units. What quality.h finds in the observed columns and in the positions is told and changes nothing. Where
/// an undercatch column is named, a station without factor is left out and told; Error(data) for a factor outside
/// 0..10. A series table without any of the observed columns is passed over as long as another one has them.
std::vector<Record> read_records(const Tables& tables, const Mapping& mapping, const Options& options,
                                 Notices& notices);

/// What the record has of these years (ascending). Normals go: they hold other years too. Complete years count anew.
Record of_years(const Record& record, const std::vector<int>& years);

/// Sites with coordinates, each once, in the table's order; what is left out is told. Errors as for read_records.
std::vector<Site> read_sites(const text::CsvTable& table, const Mapping& mapping, Notices& notices);

}  // namespace windrow::station
