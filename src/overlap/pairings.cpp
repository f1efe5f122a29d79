// Parts of overlaps become pairings.
#include "pairings.h"

#include <algorithm>

namespace windrow::overlap {

void Found::close_row(double sliver, Rows& out) {
  std::stable_sort(parts_.begin(), parts_.end(), [](const Part& a, const Part& b) { return a.column < b.column; });
  const std::size_t before = out.pairings.size();
  for (std::size_t k = 0; k < parts_.size();) {
    Part sum = parts_[k];
    for (++k; k < parts_.size() && parts_[k].column == sum.column; ++k) {
      sum.area += parts_[k].area;
      sum.moment[0] += parts_[k].moment[0];
      sum.moment[1] += parts_[k].moment[1];
    }
    if (!(sum.area > sliver)) continue;
    out.pairings.push_back({sum.column, sum.area});
    if (frame_.source != nullptr) out.moments.push_back(sum.moment);
  }
  out.count.push_back(static_cast<std::uint32_t>(out.pairings.size() - before));
  parts_.clear();
}

}  // namespace windrow::overlap
