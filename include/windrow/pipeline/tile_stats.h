// What a tile tells about itself: integrals for the conservation balance, counts, flags. Adds up exactly in any order.
#pragma once
#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "windrow/base/exact_sum.h"

namespace windrow::pipeline {

/// Bits of the product's status_flag.
enum Flag : std::uint8_t {
  kAdjusted = 1,       ///< adjusted to stations
  kFilled = 2,         ///< filled from the nearest source cell at some time
  kTooLittleCover = 4, ///< cover below min_cover at some time
  kTooLittleLand = 8,  ///< land share below min_land
  kBeyondReach = 16,   ///< farther than the radius from every station
  kAllSurface = 32,    ///< no land in the source cells: all-surface value
  kBeyondRange = 64    ///< some values lie beyond the calibrated range
};

/// What is counted, in values (cells x steps) unless said otherwise.
enum Count : std::size_t {
  kMissing,        ///< missing in the product
  kFilledValues,
  kLowCover,       ///< some cover, but below min_cover or min_land
  kClampedLow,
  kClampedHigh,
  kTailLow,        ///< below the calibrated range
  kTailHigh,
  kReordered,      ///< nodes moved to keep targets in order (cells x seasons x nodes)
  kCapped,         ///< cells x seasons whose ratio met its cap
  kCounts
};

/// Integrals over area, in source units times steradians; each is two exact bins a step (BinnedSum).
enum Integral : std::size_t {
  kKept,    ///< double results of the map in cells that pass min_cover and min_land
  kBelow,   ///< double results in cells that do not
  kFilledIntegral,  ///< filled values, over the whole cell
  kStored,  ///< stored float32 values of kept cells, units converted back (regridding only)
  kIntegrals
};

struct TileStats {
  std::size_t steps = 0;
  std::array<std::vector<double>, kIntegrals> high, low;  ///< [integral][step]
  std::array<std::uint64_t, kCounts> count{};
  float minimum = 3.4e38F, maximum = -3.4e38F;            ///< of the stored values
  std::vector<std::uint8_t> flags;                        ///< one a cell of the block

  void resize(std::size_t step_count, std::size_t cells);
  /// Adds a tile of other cells at the same steps, starting at step `t0` of this one; flags are left alone.
  void add(const TileStats& other, std::size_t t0);
  [[nodiscard]] double integral(Integral which, std::size_t step) const { return high[which][step] + low[which][step]; }
};

std::vector<std::byte> serialise(const TileStats& stats);
bool parse(std::span<const std::byte> bytes, TileStats& stats);  ///< false when damaged

}  // namespace windrow::pipeline
