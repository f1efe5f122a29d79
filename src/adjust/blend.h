// Between a cell's own target and the stations' mean correction; caps of ratios. Shared by all tables.
#pragma once
#include <cstddef>
#include <span>

#include "windrow/adjust/transfer.h"

namespace windrow::adjust {

/// fade * near + (1 - fade) * far, where a side without weight need not exist.
inline double blend(double fade, double near, double far) {
  if (fade >= 1) return near;
  if (fade <= 0) return far;
  return fade * near + (1 - fade) * far;
}

inline double at(std::span<const double> values, std::size_t i) { return values.empty() ? 0 : values[i]; }

/// The ratio within its caps; counts when it met one.
inline double capped(const Setup& setup, double ratio, int& caps) {
  if (ratio <= setup.max_ratio && ratio >= 1 / setup.max_ratio) return ratio;
  ++caps;
  return ratio > setup.max_ratio ? setup.max_ratio : 1 / setup.max_ratio;
}

/// The ratio a season's mean shall be multiplied with, capped; counts caps and seasons whose own mean allows no ratio.
double season_ratio(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season,
                    int& caps);

}  // namespace windrow::adjust
