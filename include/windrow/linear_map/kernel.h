// Applying a map to a block of time steps: the one fast kernel.
#pragma once
#include <array>
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

#include "windrow/linear_map/linear_map.h"

namespace windrow::linear_map {

/// Time steps computed side by side; source blocks are interleaved by it.
inline constexpr std::size_t kLanes = 8;

/// Weights of one map together with an optional fraction of each column (land), ready to apply.
/// weight = share * fraction; a row without any weight uses plain shares (all-surface value) and is flagged.
struct Weights {
  const LinearMap* map = nullptr;
  std::vector<double> weight;      ///< one a pairing
  std::vector<double> row_weight;  ///< sum of a row's weights in pairing order
  std::vector<double> row_cover;   ///< sum of a row's shares in pairing order (mean), capped at 1
  std::vector<double> row_fraction;  ///< row_weight / row share sum (land share); 1 without fractions
  std::vector<std::uint8_t> all_surface;  ///< row fell back to plain shares
};
/// `fraction`: one a column in 0..1, or empty. NaN fractions count as 0.
Weights make_weights(const LinearMap& map, std::span<const double> fraction);

/// Source values interleaved: value[(block * columns + column) * kLanes + lane], step = block * kLanes + lane.
/// The last block is padded with NaN.
template <typename T>
struct SourceBlock {
  std::size_t columns = 0, steps = 0;
  std::vector<T> value;
  [[nodiscard]] std::size_t blocks() const { return (steps + kLanes - 1) / kLanes; }
  void resize(std::size_t column_count, std::size_t step_count);
  /// `values[t * columns + c]`, t0 <= t < t0 + count, into steps t0...
  void fill(std::size_t t0, std::size_t count, const T* values);
};

/// Values and cover of one row for the kLanes steps of one block, in double.
/// Law: the missing-data path gives the same bits as the plain path on complete rows.
struct RowLanes {
  std::array<double, kLanes> value;   ///< NaN where no value is present
  std::array<double, kLanes> cover;   ///< share of the cell's area covered by cells that have a value
  std::array<double, kLanes> weight;  ///< sum of present weights: value * weight * row_area is the integral
};

/// One row, one block. A row with a single pairing of a mean hands the source value on unchanged.
template <typename T>
void apply_row(const Weights& weights, std::size_t row, const SourceBlock<T>& source, std::size_t block, RowLanes& out);

/// A row over all steps of the source: series[t].
template <typename T>
void apply_series(const Weights& weights, std::size_t row, const SourceBlock<T>& source, std::span<double> series);

}  // namespace windrow::linear_map
