// Regridding only: one unit is one tile, made kLanes steps at a time.
#include <algorithm>
#include <bit>
#include <cmath>

#include "lanes.h"
#include "worker.h"

namespace windrow::pipeline {
namespace {

struct TileTask {
  const StageInput& input;
  const linear_map::SourceBlock& source;
  Block block;
  std::size_t s0, s1;  ///< steps of the source block
  std::size_t run_t0;  ///< the source block's first step on the run's axis
  float* out;          ///< data chunk
  float* cover;        ///< cover chunk or null
  TileStats& stats;
  std::vector<double> factor, need;  ///< one a cell of the block: balance_factor, least_cover
};

/// Missing, filled and clamped lanes of one row: rare, so apart from the fast loop.
void handle_exceptions(TileTask& task, std::size_t row, std::size_t cell, std::size_t step0, std::uint32_t valid,
                       bool land_ok, LaneOutcome& lanes, LaneSums& sums) {
  const auto& field = task.input.field;
  task.stats.count[kClampedLow] += static_cast<std::uint64_t>(std::popcount(lanes.low & valid));
  task.stats.count[kClampedHigh] += static_cast<std::uint64_t>(std::popcount(lanes.high & valid));
  for (std::size_t lane = 0; lane < kLanes; ++lane) {
    const std::uint32_t bit = 1U << lane;
    if ((valid & bit) == 0 || (lanes.kept & bit) != 0) continue;
    if ((lanes.present & bit) != 0) ++task.stats.count[kLowCover];
    if (land_ok) task.stats.flags[cell] |= kTooLittleCover;
    if (land_ok && !task.input.fill.empty()) {
      const double x = fill_value(task.input, row, task.source, step0 + lane);
      if (!std::isnan(x)) {
        double u = x * field.scale + field.offset;
        if (field.has_range) u = std::clamp(u, field.low, field.high);
        lanes.value[lane] = static_cast<float>(u);
        double high, low;
        task.input.bins.at(task.run_t0 + step0 + lane).split(x * balance_factor(task.input, row), high, low);
        sums.high[kFilledIntegral][lane] += high;
        sums.low[kFilledIntegral][lane] += low;
        task.stats.flags[cell] |= kFilled;
        ++task.stats.count[kFilledValues];
        continue;
      }
    }
    ++task.stats.count[kMissing];
  }
}

void make_lane_block(TileTask& task, std::size_t lane_block) {
  const auto& input = task.input;
  const auto& weights = *input.weights;
  const std::size_t plane = input.chunk.y * input.chunk.x, step0 = lane_block * kLanes;
  const std::size_t first = std::max(task.s0, step0), last = std::min(task.s1, step0 + kLanes);
  std::uint32_t valid = 0;
  for (std::size_t s = first; s < last; ++s) valid |= 1U << (s - step0);
  LaneSums sums;
  for (std::size_t s = first; s < last; ++s) {
    sums.m1[s - step0] = input.bins.m1[task.run_t0 + s];
    sums.m2[s - step0] = input.bins.m2[task.run_t0 + s];
  }
  linear_map::RowLanes row_lanes;
  LaneOutcome lanes;
  for (std::size_t y = task.block.y0; y < task.block.y1; ++y) {
    std::size_t row = y * input.nx + task.block.x0;
    std::size_t at = (y - task.block.y0) * input.chunk.x;
    std::size_t cell = (y - task.block.y0) * (task.block.x1 - task.block.x0);
    for (std::size_t x = task.block.x0; x < task.block.x1; ++x, ++row, ++at, ++cell) {
      linear_map::apply_row(weights, row, task.source, lane_block, row_lanes);
      const double need = task.need[cell];
      finish_lanes(row_lanes, input.field, task.factor[cell], need, sums, lanes);
      if ((valid & ~lanes.kept) != 0 || ((lanes.low | lanes.high) & valid) != 0) {
        handle_exceptions(task, row, cell, step0, valid, need <= 1.0, lanes, sums);
      }
      for (std::size_t s = first; s < last; ++s) task.out[(s - task.s0) * plane + at] = lanes.value[s - step0];
      if (task.cover == nullptr) continue;
      for (std::size_t s = first; s < last; ++s) {
        task.cover[(s - task.s0) * plane + at] = static_cast<float>(row_lanes.cover[s - step0]);
      }
    }
  }
  for (std::size_t s = first; s < last; ++s) {
    for (std::size_t i = 0; i < kIntegrals; ++i) {
      task.stats.high[i][s - task.s0] = sums.high[i][s - step0];
      task.stats.low[i][s - task.s0] = sums.low[i][s - step0];
    }
  }
}

void mark_fixed_flags(const StageInput& input, const Block& block, TileStats& stats) {
  const auto& weights = *input.weights;
  std::size_t cell = 0;
  for (std::size_t y = block.y0; y < block.y1; ++y) {
    for (std::size_t x = block.x0; x < block.x1; ++x, ++cell) {
      const std::size_t row = y * input.nx + x;
      if (weights.row_fraction[row] < input.field.min_land) stats.flags[cell] |= kTooLittleLand;
      if (weights.all_surface[row] != 0) stats.flags[cell] |= kAllSurface;
    }
  }
}

}  // namespace

void make_tile(const StageInput& input, const plan::Unit& unit, const linear_map::SourceBlock& source,
               std::size_t source_t0, ChunkEncoder& data, ChunkEncoder& cover) {
  const plan::Piece& piece = unit.pieces.front();
  const Block block = block_of(input, unit.block);
  TileStats stats;
  stats.resize(piece.t1 - piece.t0, block.cells());
  float* out = data.begin_chunk();
  float* cover_out = input.products[piece.product].cover_varies ? cover.begin_chunk() : nullptr;
  TileTask task{input, source, block, piece.t0 - source_t0, piece.t1 - source_t0, source_t0, out, cover_out,
                stats, {}, {}};
  for (std::size_t y = block.y0; y < block.y1; ++y) {
    for (std::size_t x = block.x0; x < block.x1; ++x) {
      task.factor.push_back(balance_factor(input, y * input.nx + x));
      task.need.push_back(least_cover(input, y * input.nx + x));
    }
  }
  for (std::size_t b = task.s0 / kLanes; b * kLanes < task.s1; ++b) make_lane_block(task, b);
  mark_fixed_flags(input, block, stats);
  const std::size_t count = input.chunk.time * input.chunk.y * input.chunk.x;
  if (input.field.keep_bits > 0) round_bits(out, count, input.field.keep_bits, input.field.missing);
  add_extremes(out, count, input.field.missing, stats);
  const TileId id{input.products[piece.product].key, kDataVariable, chunk_index(input, piece, unit.block)};
  // The cover goes first: a tile counts as done when its data chunk is there.
  if (cover_out != nullptr) cover.append({id.product, kCoverVariable, id.chunk}, nullptr);
  data.append(id, &stats);
}

}  // namespace windrow::pipeline
