// Rules of completeness for months and normals: WMO-No. 1203 (2017), section 4.4, after a secondary source.
#include <algorithm>
#include <array>
#include <limits>

#include "windrow/station/station.h"

namespace windrow::station {
namespace {

constexpr int kMissingDays = 11;     // a month of means is rejected from here on
constexpr int kConsecutiveDays = 5;  // and from so many missing days in a row on

}  // namespace

bool month_complete(const std::vector<bool>& present, Kind kind) {
  int missing = 0, run = 0, longest = 0;
  for (const bool there : present) {
    run = there ? 0 : run + 1;
    missing += there ? 0 : 1;
    longest = std::max(longest, run);
  }
  if (present.empty() || kind == Kind::sum) return !present.empty() && missing == 0;
  return missing < kMissingDays && longest < kConsecutiveDays && missing < static_cast<int>(present.size());
}

int months_needed(int years) { return (years * 4 + 4) / 5; }

std::vector<double> normals_of(const std::vector<MonthlyValue>& monthly, int first, int last) {
  std::vector<double> sum(12, 0.0);
  std::array<int, 12> count{};
  for (const MonthlyValue& v : monthly) {
    if (v.year < first || v.year > last) continue;
    sum[static_cast<std::size_t>(v.month - 1)] += v.value;
    ++count[static_cast<std::size_t>(v.month - 1)];
  }
  bool any = false;
  for (std::size_t m = 0; m < 12; ++m) {
    const bool enough = count[m] > 0 && count[m] >= months_needed(last - first + 1);
    sum[m] = enough ? sum[m] / count[m] : std::numeric_limits<double>::quiet_NaN();
    any = any || enough;
  }
  if (!any) sum.clear();
  return sum;
}

}  // namespace windrow::station
