// The invented stations' tables: sites.csv and daily.csv.
#pragma once
#include <string>

namespace demo {

void write_stations(const std::string& folder);

}  // namespace demo
