// Monthly climatologies: within years, then over years.
#include <cmath>
#include <limits>

#include "windrow/ensemble/ensemble.h"

namespace windrow::ensemble {
namespace {
constexpr double kLeastShare = 0.8;  // WMO-No. 1203, see the header
}  // namespace

MonthlyMeans::MonthlyMeans(std::size_t cells, int years)
    : cells_(cells), years_(years), current_(cells, 0.0), sum_(12 * cells, 0.0), count_(12 * cells, 0) {}

void MonthlyMeans::close_month() {
  if (steps_ == 0) return;
  const std::size_t at = static_cast<std::size_t>(month_ - 1) * cells_;
  for (std::size_t k = 0; k < cells_; ++k) {
    // A missing step has made the sum missing.
    if (!std::isnan(current_[k])) {
      sum_[at + k] += current_[k] / steps_;
      ++count_[at + k];
    }
    current_[k] = 0;
  }
  steps_ = 0;
}

void MonthlyMeans::add(int year, int month, std::span<const float> values) {
  if (year != year_ || month != month_) close_month();
  year_ = year;
  month_ = month;
  for (std::size_t k = 0; k < cells_; ++k) current_[k] += static_cast<double>(values[k]);
  ++steps_;
}

std::vector<double> MonthlyMeans::finish() {
  close_month();
  std::vector<double> out(sum_.size(), std::numeric_limits<double>::quiet_NaN());
  for (std::size_t i = 0; i < out.size(); ++i) {
    if (count_[i] > 0 && count_[i] >= kLeastShare * years_) out[i] = sum_[i] / count_[i];
  }
  return out;
}

}  // namespace windrow::ensemble
