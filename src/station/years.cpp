// Part of a record: chosen years, as split periods need them.
#include <algorithm>
#include <array>

#include "windrow/station/station.h"

namespace windrow::station {

Record of_years(const Record& record, const std::vector<int>& years) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "stations");
  const auto chosen = [&years](int year) { return std::binary_search(years.begin(), years.end(), year); };
  Record out;
  out.site = record.site;
  out.resolution = record.resolution;
  for (std::size_t i = 0; i < record.daily.day.size(); ++i) {
    if (!chosen(gregorian.date(record.daily.day[i]).year)) continue;
    out.daily.day.push_back(record.daily.day[i]);
    out.daily.value.push_back(record.daily.value[i]);
  }
  std::array<int, 12> count{};
  for (const MonthlyValue& value : record.monthly) {
    if (!chosen(value.year)) continue;
    out.monthly.push_back(value);
    ++count[static_cast<std::size_t>(value.month - 1)];
  }
  out.complete_years = *std::min_element(count.begin(), count.end());
  return out;
}

}  // namespace windrow::station
