// Reading observations at stations from CF NetCDF (featureType timeSeries) into the tables that CSV files give too.
// What the values mean, and which are used, is decided in `station`.
#pragma once
#include <string>
#include <vector>

#include "windrow/base/notices.h"
#include "windrow/text/csv.h"

namespace windrow::cf {

enum class StationSpan { day, month };

struct StationValues {
  text::CsvTable table;      ///< station,date or station,year,month, then a column a variable
  bool hours_known = false;  ///< time bounds say which hours a value covers
};

/// CF 1.13, chapter 9 and appendix H.2: var(station, time) and var(time, station), with time(time) or a time for each
/// station; a single station without dimension; contiguous ragged (sample_dimension) and indexed ragged
/// (instance_dimension) arrays. A station's identifier is the variable with cf_role = "timeseries_id" (char, string or
/// whole numbers); latitude and longitude by units or standard_name; elevation by standard_name surface_altitude or
/// altitude (height is a height above the surface and not taken), else by name; name by platform_name.
/// A value carries the date of the middle of its time bounds, or of its time where there are none. Missing values are
/// empty; a float32 is written in the shortest decimals that read back the same. Columns are named as the variables,
/// with their units; only those in `wanted` are filled (all when it is empty). Error(data) for another featureType, no
/// identifier, latitude, longitude or time, bounds that are no day (month), several times on one day (month), and
/// calendars other than standard, proleptic_gregorian, utc and tai.
StationValues read_station_values(const std::string& path, StationSpan span, const std::vector<std::string>& wanted,
                                  Notices& notices);

/// The sites of such files in one table: station,longitude,latitude,elevation [m],name; equal rows once.
text::CsvTable read_station_sites(const std::vector<std::string>& paths, Notices& notices);

/// True for a file that says featureType timeSeries or has a variable with cf_role = "timeseries_id".
bool has_stations(const std::string& path);

}  // namespace windrow::cf
