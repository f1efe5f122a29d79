// Statistics of one value a member. No loop over cells or times here.
#include <algorithm>
#include <cmath>
#include <limits>

#include "windrow/ensemble/ensemble.h"
#include "windrow/stats/stats.h"

namespace windrow::ensemble {
namespace {

constexpr double kMissing = std::numeric_limits<double>::quiet_NaN();

bool any_missing(std::span<const double> members) {
  return std::any_of(members.begin(), members.end(), [](double x) { return std::isnan(x); });
}

int sign(double x) { return x > 0 ? 1 : x < 0 ? -1 : 0; }

}  // namespace

double mean(std::span<const double> members) {
  if (members.empty()) return kMissing;
  double sum = 0;
  for (const double x : members) sum += x;
  return sum / static_cast<double>(members.size());
}

double spread(std::span<const double> members) {
  if (members.size() < 2) return kMissing;
  const double centre = mean(members);
  double sum = 0;
  for (const double x : members) sum += (x - centre) * (x - centre);
  // The square root is exactly rounded everywhere (IEEE 754), unlike other functions of the library.
  return std::sqrt(sum / static_cast<double>(members.size() - 1));
}

double quantile(std::span<double> members, double p) {
  if (any_missing(members)) return kMissing;
  std::sort(members.begin(), members.end());
  return stats::quantile(members, p, 7);
}

double agreement(std::span<const double> changes) {
  const double centre = mean(changes);
  if (std::isnan(centre)) return kMissing;
  std::size_t same = 0;
  for (const double x : changes) same += sign(x) == sign(centre) ? 1 : 0;
  return static_cast<double>(same) / static_cast<double>(changes.size());
}

}  // namespace windrow::ensemble
