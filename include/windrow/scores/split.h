// What is left out of a fit and scored: single stations, blocks of stations, years. Lists only; nothing is fitted here.
#pragma once
#include <cstddef>
#include <functional>
#include <span>
#include <utility>
#include <vector>

#include "windrow/base/angle.h"

namespace windrow::scores {

/// Metres between stations i and j; symmetric.
using Distance = std::function<double(std::size_t, std::size_t)>;

/// A station nearer than this, or as near, shares the site of the one left out: it would give the answer away.
inline constexpr double kSameSite_m = 2000;

struct StationSplit {
  std::vector<std::size_t> scored, fitted;  ///< ascending; stations in neither are too near to a scored one
};
/// One split a station: it is scored, all others farther than `radius_m` are fitted.
std::vector<StationSplit> leave_one_out(std::size_t stations, const Distance& distance, double radius_m = kSameSite_m);
/// One split a block that holds a station: its stations are scored, those of other blocks farther than `radius_m` from
/// all of them are fitted. `block` holds each station's block, 0 or more (Error(defect) otherwise).
std::vector<StationSplit> leave_blocks_out(const std::vector<int>& block, const Distance& distance,
                                           double radius_m = kSameSite_m);

/// The block (0 .. blocks-1) of each station: stations are halved along the longer side of their latitude-longitude box
/// (its width taken at the middle latitude), again and again, in proportion where the number of blocks is odd: numbers
/// of stations differ by at most one. The widest gap between neighbouring meridians of stations is the box's seam, so
/// the date line does not matter. Ties in a coordinate go by the other one, then by the list's order: where no two
/// stations share a position, blocks do not depend on the order. Error(defect) unless 1 <= blocks; more blocks than
/// stations leave some empty.
std::vector<int> spatial_blocks(std::span<const GeoPoint> stations, int blocks);

struct YearSplit {
  std::vector<int> fitted, scored;  ///< ascending
};
/// Odd years fitted and even ones scored, then the other way round.
std::vector<YearSplit> odd_and_even(std::span<const int> years);
/// First half fitted and second scored, then the other way round; of an odd number the middle year goes to the second
/// half. Years are sorted first.
std::vector<YearSplit> halves(std::span<const int> years);

}  // namespace windrow::scores
