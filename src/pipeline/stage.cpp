#include "windrow/pipeline/stage.h"

#include <omp.h>

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>

#include "windrow/base/error.h"
#include "worker.h"

namespace windrow::pipeline {
namespace {

/// The first exception any worker met; the others stop when there is one.
class FirstError {
 public:
  void keep() {
    const std::lock_guard lock(mutex_);
    if (!error_) error_ = std::current_exception();
    set_ = true;
  }
  [[nodiscard]] bool set() const { return set_; }
  void rethrow() const {
    if (error_) std::rethrow_exception(error_);
  }

 private:
  std::mutex mutex_;
  std::exception_ptr error_;
  std::atomic<bool> set_ = false;
};

/// Counts chunks still to make; tells which products a unit has completed.
class Completion {
 public:
  Completion(const StageInput& input, const plan::Stage& stage, const Spool& spool)
      : open_(input.products.size()) {
    for (const auto& batch : stage.batches) {
      for (const auto& unit : batch.units) {
        for (const auto& piece : unit.pieces) {
          const TileId id{input.products[piece.product].key, kDataVariable, chunk_index(input, piece, unit.block)};
          if (!spool.has(id)) ++open_[piece.product];
        }
      }
    }
  }
  /// Products without an open chunk, from the start.
  [[nodiscard]] std::vector<std::size_t> complete(const StageInput& input) const {
    std::vector<std::size_t> out;
    for (std::size_t p = 0; p < open_.size(); ++p) {
      if (input.products[p].span.wanted && open_[p] == 0) out.push_back(p);
    }
    return out;
  }
  /// True when this was the last chunk of the product.
  bool done(std::size_t product) {
    const std::lock_guard lock(mutex_);
    return --open_[product] == 0;
  }

 private:
  std::mutex mutex_;
  std::vector<std::size_t> open_;
};

std::int64_t chunk_bytes(const StageInput& input) {
  return static_cast<std::int64_t>(input.chunk.time * input.chunk.y * input.chunk.x * sizeof(float));
}

/// Units with what the spool lacks of them.
std::vector<plan::Unit> open_units(const StageInput& input, const plan::Batch& batch, const Spool& spool,
                                   const StageHooks& hooks) {
  std::vector<plan::Unit> out;
  for (const auto& unit : batch.units) {
    plan::Unit rest{unit.block, {}};
    for (const auto& piece : unit.pieces) {
      const TileId id{input.products[piece.product].key, kDataVariable, chunk_index(input, piece, unit.block)};
      if (!spool.has(id)) {
        rest.pieces.push_back(piece);
      } else if (hooks.progress) {
        hooks.progress(chunk_bytes(input));
      }
    }
    if (!rest.pieces.empty()) out.push_back(std::move(rest));
  }
  return out;
}

/// Reads a window in slices, so that the staging buffer stays small beside the window itself.
linear_map::SourceBlock load(const SourceReader& reader, const std::vector<std::uint32_t>& columns,
                             std::size_t all_columns, std::size_t t0, std::size_t t1) {
  linear_map::SourceBlock source;
  source.resize(columns, all_columns, t1 - t0);
  constexpr std::size_t kSliceBytes = 16 << 20;
  const std::size_t slice = std::max<std::size_t>(1, kSliceBytes / sizeof(double) / std::max<std::size_t>(1, columns.size()));
  std::vector<double> values;
  for (std::size_t t = t0; t < t1; t += slice) {
    const std::size_t count = std::min(slice, t1 - t);
    values.resize(count * columns.size());
    reader.read(columns, t, t + count, values.data());
    source.fill(t - t0, count, values.data());
  }
  return source;
}

class StageRun {
 public:
  StageRun(const StageInput& input, const plan::Stage& stage, Spool& spool, const StageHooks& hooks)
      : input_(input), stage_(stage), spool_(spool), hooks_(hooks), completion_(input, stage, spool) {}

  void run(const SourceReader& run, const SourceReader* anchor) {
    for (const std::size_t product : completion_.complete(input_)) hooks_.finish(product);
    for (const auto& batch : stage_.batches) {
      const auto units = open_units(input_, batch, spool_, hooks_);
      if (units.empty()) continue;
      const std::size_t all = input_.weights->map->columns;
      const auto source = load(run, batch.columns, all, batch.t0, batch.t1);
      linear_map::SourceBlock anchor_source;
      if (anchor != nullptr) anchor_source = load(*anchor, batch.columns, all, 0, input_.adjust->anchor_steps.month.size());
      work(units, source, batch.t0, anchor != nullptr ? anchor_source : source);
      error_.rethrow();
    }
  }

 private:
  void work(const std::vector<plan::Unit>& units, const linear_map::SourceBlock& source, std::size_t source_t0,
            const linear_map::SourceBlock& anchor) {
#pragma omp parallel num_threads(stage_.threads)
    try {
      ChunkEncoder data(input_, spool_), cover(input_, spool_);
      std::unique_ptr<ColumnWorker> column;
      if (input_.adjust != nullptr) column = std::make_unique<ColumnWorker>(input_, data, cover);
#pragma omp for schedule(dynamic, 1)
      // NOLINTNEXTLINE(modernize-loop-convert): OpenMP wants the counted form
      for (std::size_t i = 0; i < units.size(); ++i) {
        if (error_.set()) continue;
        try {
          if (hooks_.stop && hooks_.stop()) {
            throw Error(Failure::interrupted, "", "interrupted; run again to go on from here");
          }
          if (column) {
            column->make(units[i], source, anchor);
          } else {
            make_tile(input_, units[i], source, source_t0, data, cover);
          }
          finish(units[i]);
        } catch (...) {
          error_.keep();
        }
      }
    } catch (...) {
      error_.keep();
    }
  }

  void finish(const plan::Unit& unit) {
    for (const auto& piece : unit.pieces) {
      if (hooks_.progress) hooks_.progress(chunk_bytes(input_));
      if (completion_.done(piece.product)) hooks_.finish(piece.product);
    }
  }

  const StageInput& input_;
  const plan::Stage& stage_;
  Spool& spool_;
  const StageHooks& hooks_;
  Completion completion_;
  FirstError error_;
};

}  // namespace

void run_stage(const StageInput& input, const plan::Stage& stage, const SourceReader& run, const SourceReader* anchor,
               Spool& spool, const StageHooks& hooks) {
  StageRun(input, stage, spool, hooks).run(run, anchor);
}

TileStats merge_stats(const StageInput& input, std::size_t product, const Spool& spool) {
  const auto& span = input.products[product].span;
  TileStats out, tile;
  out.resize(span.t1 - span.t0, input.ny * input.nx);
  std::vector<std::byte> bytes;
  std::uint32_t time_chunk = 0;
  for (std::size_t t = span.t0; t < span.t1; t += input.chunk.time, ++time_chunk) {
    const plan::Piece piece{static_cast<std::uint32_t>(product), time_chunk, t, std::min(span.t1, t + input.chunk.time)};
    for (std::uint32_t b = 0; b < blocks_of(input); ++b) {
      spool.aux({input.products[product].key, kDataVariable, chunk_index(input, piece, b)}, bytes);
      const Block block = block_of(input, b);
      if (!parse(bytes, tile) || tile.steps != piece.t1 - piece.t0 || tile.flags.size() != block.cells()) {
        throw Error(Failure::io, "spool", "statistics of a tile are damaged; remove the workspace and run again");
      }
      out.add(tile, t - span.t0);
      std::size_t cell = 0;
      for (std::size_t y = block.y0; y < block.y1; ++y) {
        for (std::size_t x = block.x0; x < block.x1; ++x, ++cell) out.flags[y * input.nx + x] |= tile.flags[cell];
      }
    }
  }
  return out;
}

}  // namespace windrow::pipeline
