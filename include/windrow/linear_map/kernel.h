// Applying a map to a block of time steps: the one fast kernel.
#pragma once
#include <array>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <span>
#include <vector>

#include "windrow/linear_map/linear_map.h"

namespace windrow::linear_map {

/// Time steps computed side by side; source blocks are interleaved by it.
inline constexpr std::size_t kLanes = 8;

/// Weights of one map together with an optional fraction of each column (land), ready to apply.
/// weight = share * fraction; a row without any weight uses plain shares (all-surface value) and is flagged. Totals need
/// the map's row and column areas.
struct Weights {
  const LinearMap* map = nullptr;
  std::vector<double> weight;      ///< one a pairing; normalises
  std::vector<double> multiplier;  ///< one a pairing: weight * factor; empty where no pairing has a factor
  std::vector<double> cover;       ///< one a pairing: overlap / row-cell area, whatever the quantity; 0 for increments
  std::vector<std::uint64_t> values_end;  ///< one a row: where its value pairings end; empty without increments
  std::vector<double> row_fraction;  ///< row_weight / row share sum (land share); 1 without fractions
  std::vector<std::uint8_t> all_surface;  ///< row fell back to plain shares
  double not_below = -std::numeric_limits<double>::infinity();  ///< results below it become it (non-negative fields)
  bool categories = false;  ///< the value with the largest share instead of a mean
};
/// `fraction`: one a value column in 0..1, or empty. NaN fractions count as 0. An increment column takes the fraction of
/// its source cell: columns beyond value_columns repeat the cells in turn.
Weights make_weights(const LinearMap& map, std::span<const double> fraction);

/// Source values of some columns, interleaved: value[(block * held + slot) * kLanes + lane], step = block * kLanes + lane.
/// The last block is padded with NaN. Steps count from the block's own first step.
struct SourceBlock {
  std::size_t held = 0;             ///< columns held
  std::size_t steps = 0;
  std::vector<std::uint32_t> slot;  ///< map column -> position held; kNotHeld elsewhere
  std::vector<double> value;
  static constexpr std::uint32_t kNotHeld = 0xffffffffU;
  [[nodiscard]] std::size_t blocks() const { return (steps + kLanes - 1) / kLanes; }
  /// Holds `columns` (ascending map columns) of a map with `all_columns`.
  void resize(const std::vector<std::uint32_t>& columns, std::size_t all_columns, std::size_t step_count);
  /// `values[t * held + i]`, into steps t0 <= t < t0 + count.
  void fill(std::size_t t0, std::size_t count, const double* values);
  [[nodiscard]] double at(std::size_t step, std::size_t position) const {
    return value[((step / kLanes) * held + position) * kLanes + step % kLanes];
  }
};

/// Values and cover of one row for the kLanes steps of one block, in double.
/// Law: the missing-data path gives the same bits as the plain path on complete rows.
struct RowLanes {
  std::array<double, kLanes> value;   ///< NaN where no value is present
  std::array<double, kLanes> cover;   ///< share of the cell's area covered by cells that have a value
  std::array<double, kLanes> weight;  ///< sum of present weights (of cover, where the map has one): value * weight *
                                      ///< row_area is the integral
};

/// One row, one block; all columns of the row must be held. A row with a single pairing of a mean hands the source value on unchanged.
void apply_row(const Weights& weights, std::size_t row, const SourceBlock& source, std::size_t block, RowLanes& out);

/// A row over all steps of the source: series[t].
void apply_series(const Weights& weights, std::size_t row, const SourceBlock& source, std::span<double> series);

}  // namespace windrow::linear_map
