// Values that look like another unit than the column's. Private to station; quality.h says the rules.
#pragma once
#include <vector>

#include "windrow/station/quality.h"

namespace windrow::station {

void find_other_units(const std::vector<Site>& sites, const ObservedColumn& column, std::vector<Finding>& out);

}  // namespace windrow::station
