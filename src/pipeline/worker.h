// What tile and column workers share: the block of mesh cells at hand, its buffers, the way to the spool.
#pragma once
#include <cstddef>
#include <cstdint>
#include <memory>
#include <vector>

#include "windrow/codec/codec.h"
#include "windrow/pipeline/stage.h"

namespace windrow::pipeline {

/// The mesh cells of one block; edge blocks are smaller than a chunk.
struct Block {
  std::size_t y0 = 0, y1 = 0, x0 = 0, x1 = 0;
  [[nodiscard]] std::size_t cells() const { return (y1 - y0) * (x1 - x0); }
};
Block block_of(const StageInput& input, std::uint32_t index);
std::uint32_t blocks_of(const StageInput& input);

/// Cover that rounding of shares may cost: the bound on row sums (1e-12 + 8 eps * perimeter / area) stays below it for
/// cells down to some metres.
inline constexpr double kCoverTolerance = 1e-9;

/// Per-thread state: compressor and chunk buffers.
class ChunkEncoder {
 public:
  ChunkEncoder(const StageInput& input, Spool& spool);
  /// The chunk under work, filled with the missing value.
  float* begin_chunk();
  /// Shuffles, compresses and appends the chunk under work.
  void append(const TileId& id, const TileStats* stats);

 private:
  const StageInput& input_;
  Spool& spool_;
  std::unique_ptr<codec::Deflater> deflater_;
  std::vector<float> raw_;
  std::vector<std::byte> shuffled_, packed_;
};

/// What a row's value * weight is multiplied with in integrals: its area (mean) or 1 (total); 0 for rows outside the
/// balance, which carry an all-surface value.
double balance_factor(const StageInput& input, std::size_t row);

/// Cover that a row's values need to be kept; out of reach where its land share is below min_land.
double least_cover(const StageInput& input, std::size_t row);

/// Keeps `bits` explicit mantissa bits, rounding to nearest even (CF 8.4 "bitround").
void round_bits(float* values, std::size_t count, int bits, float missing);

/// Minimum and maximum of what is not missing, added to `stats`.
void add_extremes(const float* values, std::size_t count, float missing, TileStats& stats);

/// Value of the nearest source cell that has one at `step` of `source`; NaN when none of the candidates has.
double fill_value(const StageInput& input, std::size_t row, const linear_map::SourceBlock& source, std::size_t step);

void make_tile(const StageInput& input, const plan::Unit& unit, const linear_map::SourceBlock& source,
               std::size_t source_t0, ChunkEncoder& data, ChunkEncoder& cover);

/// Buffers of a column worker live across units.
class ColumnWorker {
 public:
  ColumnWorker(const StageInput& input, ChunkEncoder& data, ChunkEncoder& cover);
  ~ColumnWorker();
  void make(const plan::Unit& unit, const linear_map::SourceBlock& run, const linear_map::SourceBlock& anchor);

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace windrow::pipeline
