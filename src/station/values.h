// Values of the series and normals tables, one a station and date, in output units.
#pragma once
#include <cstdint>
#include <string>
#include <unordered_map>
#include <vector>

#include "windrow/station/quality.h"
#include "windrow/station/station.h"

namespace windrow::station {

enum class TableKind { daily, monthly, normals };

struct Value {
  std::int64_t date = 0;  // day number; year * 12 + month 0..11; month 0..11
  double value = 0;
};

/// "1981-01-31", "1981-01" or "month 1"
std::string date_text(TableKind kind, std::int64_t date);

/// Values by station (the order of `station_of`), ascending in date, impossible ones and contradictions left out.
/// `found` becomes true when a table has the observed columns. `each` gets the columns by themselves, impossible values
/// included, in quality.h's units: one an observed column, in their order; repeated dates once.
std::vector<std::vector<Value>> read_values(const std::vector<text::CsvTable>& tables, TableKind kind,
                                            const std::unordered_map<std::string, std::size_t>& station_of,
                                            const Mapping& mapping, const Options& options, Notices& notices,
                                            const std::vector<bool>& hours_known, bool& found,
                                            std::vector<ObservedColumn>& each);

}  // namespace windrow::station
