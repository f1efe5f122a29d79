// The sites table.
#pragma once
#include <map>
#include <string>
#include <vector>

#include "windrow/station/station.h"

namespace windrow::station {

/// Says which of the sites used stand at one position or have no elevation.
void tell_oddities(const std::vector<Record>& records, const std::string& file, Notices& notices);

/// Undercatch factors of `column` by station; empty without a column's name. Error(data) where the table has no such
/// column, or for a factor that is not above 0 and at most 10.
std::map<std::string, double> read_factors(const text::CsvTable& table, const Mapping& mapping,
                                           const std::string& column);

}  // namespace windrow::station
