// The sites table.
#pragma once
#include <vector>

#include "windrow/station/station.h"

namespace windrow::station {

/// Says which of the sites used stand at one position or have no elevation.
void tell_oddities(const std::vector<Record>& records, const std::string& file, Notices& notices);

}  // namespace windrow::station
