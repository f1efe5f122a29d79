// Adjusted fields: one unit is a column, a block of mesh cells over a segment of the run. Cells with the same pairings
// share the regridded series, the calibration climate and the ranks.
#include <algorithm>
#include <cmath>
#include <map>
#include <string>

#include "lanes.h"
#include "row_series.h"
#include "windrow/pipeline/cell.h"
#include "worker.h"

namespace windrow::pipeline {
namespace {

std::array<double, 12> shifts(const std::array<double, 12>& lapse, double height) {
  std::array<double, 12> out{};
  for (std::size_t m = 0; m < 12; ++m) out[m] = lapse[m] * height;
  return out;
}

WINDROW_CLONES
void add_terms(const double* weighted, const std::uint8_t* kept, double area, const double* m1, const double* m2,
               std::size_t count, TileStats& stats) {
  double* kept_high = stats.high[kKept].data();
  double* kept_low = stats.low[kKept].data();
  double* below_high = stats.high[kBelow].data();
  double* below_low = stats.low[kBelow].data();
  for (std::size_t t = 0; t < count; ++t) {
    const double term = weighted[t] * area;
    const double high = (term + m1[t]) - m1[t];
    const double low = ((term - high) + m2[t]) - m2[t];
    kept_high[t] += kept[t] != 0 ? high : 0.0;
    kept_low[t] += kept[t] != 0 ? low : 0.0;
    below_high[t] += kept[t] != 0 ? 0.0 : high;
    below_low[t] += kept[t] != 0 ? 0.0 : low;
  }
}

}  // namespace

struct ColumnWorker::State {
  const StageInput& input;
  const AdjustInput& adjust;
  ChunkEncoder &data, &cover;
  RowSeries row, anchor_row;
  adjust::RowClimate climate;
  adjust::Ranks ranks;
  CellCorrection cell_correction;
  std::vector<double> out;
  std::size_t first = 0, steps = 0;  ///< steps of the segment on the run's axis
  std::vector<float> values;         ///< [cell][step of the segment]
  std::vector<TileStats> stats;      ///< one a piece

  State(const StageInput& stage, ChunkEncoder& data_encoder, ChunkEncoder& cover_encoder)
      : input(stage), adjust(*stage.adjust), data(data_encoder), cover(cover_encoder) {}

  void prepare_row(std::size_t mesh_row, const linear_map::SourceBlock& run, const linear_map::SourceBlock& anchor);
  void make_cell(std::size_t mesh_row, std::size_t cell, const std::vector<plan::Piece>& pieces);
  void count_cell(std::size_t mesh_row, std::size_t cell, bool adjusted, const plan::Piece& piece, TileStats& tile);
  void write(const plan::Piece& piece, TileStats& tile, std::uint32_t block_index, const linear_map::SourceBlock& run);
  void write_cover(const plan::Piece& piece, const Block& block, const TileId& id, const linear_map::SourceBlock& run);
};

ColumnWorker::ColumnWorker(const StageInput& input, ChunkEncoder& data, ChunkEncoder& cover)
    : state_(std::make_unique<State>(input, data, cover)) {}
ColumnWorker::~ColumnWorker() = default;

void ColumnWorker::State::prepare_row(std::size_t mesh_row, const linear_map::SourceBlock& run,
                                      const linear_map::SourceBlock& anchor) {
  std::array<double, 12> shift{};
  const auto shift_of = [&](const std::vector<double>& heights) -> std::span<const double> {
    if (!adjust.terrain) return {};
    shift = shifts(adjust.lapse, heights[mesh_row]);
    return shift;
  };
  make_row_series(input, mesh_row, run, shift_of(adjust.model_height), adjust.run_steps.month, row);
  if (adjust.run_is_anchor) {
    climate = adjust::fit_row(adjust.setup, adjust.anchor_steps, row.reduced);
  } else {
    make_row_series(input, mesh_row, anchor, shift_of(adjust.anchor_model_height), adjust.anchor_steps.month,
                    anchor_row);
    climate = adjust::fit_row(adjust.setup, adjust.anchor_steps, anchor_row.reduced);
  }
  adjust::rank_series(adjust.setup, adjust.run_steps, climate, row.reduced, ranks);
}

void ColumnWorker::State::count_cell(std::size_t mesh_row, std::size_t cell, bool adjusted, const plan::Piece& piece,
                                     TileStats& tile) {
  const std::size_t t0 = piece.t0, count = piece.t1 - piece.t0;
  add_terms(row.weighted.data() + t0, row.kept.data() + t0, balance_factor(input, mesh_row), input.bins.m1.data() + t0,
            input.bins.m2.data() + t0, count, tile);
  const bool land_ok = input.weights->row_fraction[mesh_row] >= input.field.min_land;
  std::uint8_t flags = adjusted ? kAdjusted : 0;
  if (!land_ok) flags |= kTooLittleLand;
  if (input.weights->all_surface[mesh_row] != 0) flags |= kAllSurface;
  if (adjusted && adjust.level->fade[mesh_row] <= 0) flags |= kBeyondReach;
  for (std::size_t t = t0; t < t0 + count; ++t) {
    if (row.kept[t] == 0) {
      if (land_ok) flags |= kTooLittleCover;
      if (row.filled[t] != 0) {
        flags |= kFilled;
        ++tile.count[kFilledValues];
      }
    }
    if (adjusted && (row.kept[t] != 0 || row.filled[t] != 0) && ranks.tail[t] != 0) {
      flags |= kBeyondRange;
      ++tile.count[ranks.tail[t] == 2 ? kTailHigh : kTailLow];
    }
  }
  tile.flags[cell] = flags;
  if (piece.time_chunk == 0 && adjusted) {
    tile.count[kReordered] += static_cast<std::uint64_t>(cell_correction.correction.reordered);
    tile.count[kCapped] += static_cast<std::uint64_t>(cell_correction.correction.capped);
  }
}

void ColumnWorker::State::make_cell(std::size_t mesh_row, std::size_t cell, const std::vector<plan::Piece>& pieces) {
  const RowSeries& calibration = adjust.run_is_anchor ? row : anchor_row;
  const bool adjusted = correct_cell(adjust, mesh_row, climate, calibration.reduced, cell_correction);
  const std::size_t run_steps = row.reduced.size();
  out.resize(run_steps);
  if (adjusted) {
    adjust::evaluate(adjust.setup, adjust.run_steps, row.reduced, ranks, cell_correction.correction,
                     cell_correction.run_draws ? &*cell_correction.run_draws : nullptr, out);
  } else {
    std::fill(out.begin(), out.end(), std::nan(""));
  }
  std::array<double, 12> shift{};
  if (adjust.terrain) shift = shifts(adjust.lapse, adjust.cell_height[mesh_row]);
  const auto& field = input.field;
  for (std::size_t p = 0; p < pieces.size(); ++p) {
    TileStats& tile = stats[p];
    count_cell(mesh_row, cell, adjusted, pieces[p], tile);
    for (std::size_t t = pieces[p].t0; t < pieces[p].t1; ++t) {
      double u = out[t] + shift[adjust.run_steps.month[t]];
      float& stored = values[cell * steps + (t - first)];
      if (u != u) {
        stored = field.missing;
        ++tile.count[kMissing];
        continue;
      }
      if (field.has_range && u < field.low) {
        u = field.low;
        ++tile.count[kClampedLow];
      } else if (field.has_range && u > field.high) {
        u = field.high;
        ++tile.count[kClampedHigh];
      }
      stored = static_cast<float>(u);
    }
    for (std::size_t t = pieces[p].t0; t < pieces[p].t1; ++t) {
      // Some cover but not enough: counted apart from no source at all.
      if (row.kept[t] == 0 && row.weighted[t] != 0.0) ++tile.count[kLowCover];
    }
  }
}

void ColumnWorker::State::write_cover(const plan::Piece& piece, const Block& block, const TileId& id,
                                      const linear_map::SourceBlock& run) {
  float* chunk = cover.begin_chunk();
  const std::size_t plane = input.chunk.y * input.chunk.x;
  linear_map::RowLanes lanes;
  for (std::size_t y = block.y0; y < block.y1; ++y) {
    for (std::size_t x = block.x0; x < block.x1; ++x) {
      const std::size_t at = (y - block.y0) * input.chunk.x + (x - block.x0);
      for (std::size_t b = piece.t0 / kLanes; b * kLanes < piece.t1; ++b) {
        linear_map::apply_row(*input.weights, y * input.nx + x, run, b, lanes);
        for (std::size_t t = std::max(piece.t0, b * kLanes); t < std::min(piece.t1, (b + 1) * kLanes); ++t) {
          chunk[(t - piece.t0) * plane + at] = static_cast<float>(lanes.cover[t - b * kLanes]);
        }
      }
    }
  }
  cover.append({id.product, kCoverVariable, id.chunk}, nullptr);
}

void ColumnWorker::State::write(const plan::Piece& piece, TileStats& tile, std::uint32_t block_index,
                                const linear_map::SourceBlock& run) {
  const Block block = block_of(input, block_index);
  const TileId id{input.products[piece.product].key, kDataVariable, chunk_index(input, piece, block_index)};
  if (input.products[piece.product].cover_varies) write_cover(piece, block, id, run);
  float* chunk = data.begin_chunk();
  const std::size_t plane = input.chunk.y * input.chunk.x, width = block.x1 - block.x0;
  for (std::size_t cell = 0; cell < block.cells(); ++cell) {
    const std::size_t at = cell / width * input.chunk.x + cell % width;
    const float* from = values.data() + cell * steps + (piece.t0 - first);
    for (std::size_t t = 0; t < piece.t1 - piece.t0; ++t) chunk[t * plane + at] = from[t];
  }
  const std::size_t count = input.chunk.time * plane;
  if (input.field.keep_bits > 0) round_bits(chunk, count, input.field.keep_bits, input.field.missing);
  add_extremes(chunk, count, input.field.missing, tile);
  data.append(id, &tile);
}

void ColumnWorker::make(const plan::Unit& unit, const linear_map::SourceBlock& run,
                        const linear_map::SourceBlock& anchor) {
  State& state = *state_;
  const Block block = block_of(state.input, unit.block);
  state.first = unit.pieces.front().t0;
  state.steps = unit.pieces.back().t1 - state.first;
  state.values.resize(block.cells() * state.steps);
  state.stats.resize(unit.pieces.size());
  for (std::size_t p = 0; p < unit.pieces.size(); ++p) {
    state.stats[p].resize(unit.pieces[p].t1 - unit.pieces[p].t0, block.cells());
  }
  // Cells grouped by what decides their series; map order is fixed, so are all results.
  std::map<std::string, std::vector<std::pair<std::size_t, std::size_t>>> groups;
  std::size_t cell = 0;
  for (std::size_t y = block.y0; y < block.y1; ++y) {
    for (std::size_t x = block.x0; x < block.x1; ++x, ++cell) {
      const std::size_t row = y * state.input.nx + x;
      groups[row_key(state.input, row)].emplace_back(row, cell);
    }
  }
  for (const auto& [key, members] : groups) {
    state.prepare_row(members.front().first, run, anchor);
    for (const auto& [row, index] : members) state.make_cell(row, index, unit.pieces);
  }
  for (std::size_t p = 0; p < unit.pieces.size(); ++p) {
    state.write(unit.pieces[p], state.stats[p], unit.block, run);
  }
}

}  // namespace windrow::pipeline
