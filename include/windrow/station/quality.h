// Quality checks of observations: what looks wrong is reported with its first date and its number, and never changed.
// What is left out of a job is decided by read_records' own rules (station.h), not here.
#pragma once
#include <cstdint>
#include <string>
#include <vector>

#include "windrow/base/notices.h"
#include "windrow/station/station.h"
#include "windrow/text/csv.h"

namespace windrow::station {

enum class Fault { twin_series, stuck, units, swapped, longitude_sign, elevation };

struct Finding {
  std::string station, column;  ///< column is empty for what concerns the site
  Fault fault = Fault::stuck;
  std::string first;      ///< first date concerned, as the table's kind writes it; empty for the site
  std::size_t count = 0;  ///< values concerned; 1 for the site
  std::string sentence;   ///< without a full stop; names station and column
};

enum class Quantity {
  temperature,  ///< degC
  water,        ///< mm/day, also of monthly values
  other         ///< any units
};
struct DatedValues {
  std::vector<std::int64_t> date;  ///< ascending: day number, or year * 12 + month 0..11
  std::vector<double> value;
};
struct ObservedColumn {
  std::string name;
  Quantity quantity = Quantity::other;
  bool monthly = false;
  std::vector<DatedValues> of;  ///< one a site
};

/// Checks of values. Thresholds are this project's choice where no source is named.
/// - twin_series: two stations with more than 95 % equal values on at least 365 common days (60 months) on which
///   neither is zero.
/// - stuck: the same value, not zero, on consecutive days or months: 10 days (7 of water), 6 months.
/// - units: a calendar year whose mean and spread fit another unit and not the column's: degF, K or tenths in degC, a
///   tenth of degC; tenths of mm, inches or cm in mm. Compared with up to 5 nearest stations within 500 km, when at
///   least 3 have 200 common days (10 months) of the year and most agree; otherwise with the station's own other years
///   (at least 5); otherwise, for the whole station, with what is plausible on Earth. Neighbouring years of one kind
///   are one finding; for water at least two of them, or all.
/// - swapped: columns whose names differ by "min" and "max" only: days with the lower above the upper.
std::vector<Finding> check_columns(const std::vector<Site>& sites, const std::vector<ObservedColumn>& columns);

/// longitude_sign: the station is more than 1000 km, and ten times their usual distance, from every other and lies
/// among them (within 300 km of one, or twice their usual distance) with the sign of its longitude turned. The usual
/// distance is the median one to the nearest. Needs at least 3 others.
std::vector<Finding> check_positions(const std::vector<Site>& sites);

/// elevation: differs from the relief by more than `most_m`. `relief_m`: a height a site, NaN where there is none. A
/// cell's mean height and a station in it differ by hundreds of metres in mountains: choose `most_m` by the relief. (Of
/// 372 stations in and around Colorado 51 differ by more than 500 m from a 5-minute relief, none by more than 1500 m.)
std::vector<Finding> check_elevations(const std::vector<Site>& sites, const std::vector<double>& relief_m,
                                      double most_m = 500);

/// The resolution of a gauge: the smallest step between different values, zero among them, steps below a millionth of
/// the value apart. NaN with fewer than 20 values that are not zero.
double resolution_of(const std::vector<double>& values);

/// All checks that one table allows, for looking at it by itself: of a table of sites the positions, of a table of days
/// or months every column of numbers; without units, or with those of no known quantity, as Quantity::other. Positions
/// are not known: all stations of the table count as neighbours. Columns go by windrow's names.
std::vector<Finding> check_table(const text::CsvTable& table);

/// As notices at `place`: of a kind at most 5, then their number.
void tell(const std::vector<Finding>& findings, const std::string& place, Notices& notices);

}  // namespace windrow::station
