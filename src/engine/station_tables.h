// The files of [stations] as tables, CSV or CF NetCDF alike. Private to the engine.
#pragma once
#include <string>
#include <vector>

#include "windrow/base/notices.h"
#include "windrow/job/spec.h"
#include "windrow/station/station.h"

namespace windrow::engine {

/// Reads what the job names. Of NetCDF files only the columns `observed` are filled. Without `sites` the series' files
/// hold them. Error(missing) for a file that is not there; others as cf/stations.h and CsvTable::parse say.
station::Tables station_tables(const job::StationSpec& spec, const std::vector<std::string>& observed,
                               Notices& notices);

/// True for what falls from the sky: station values are sums of days or months, which factors for undercatch concern.
bool is_precipitation(const std::string& standard_name);

}  // namespace windrow::engine
