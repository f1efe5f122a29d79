// From sizes to units of work: chunk shapes, tiles and columns, batches that fit the memory ceiling. Pure: no I/O.
#pragma once
#include <cstddef>
#include <cstdint>
#include <string>
#include <vector>

namespace windrow::plan {

/// Shape of a product's chunk: time steps, rows, columns of mesh cells.
struct Chunk {
  std::size_t time = 1, y = 1, x = 1;
  bool operator==(const Chunk&) const = default;
};

/// What decides the automatic chunk. Never the length of the run: appended months leave old chunks alone.
struct ChunkNeeds {
  std::size_t ny = 1, nx = 1;
  bool adjusted = false;  ///< columns over the whole time axis: narrower blocks
  bool monthly = false, fixed = false;
};
Chunk automatic_chunk(const ChunkNeeds& needs);

/// One product of a stage: steps [t0, t1) of the run's axis. Chunks count from its own first step.
struct ProductSpan {
  std::size_t t0 = 0, t1 = 0;
  bool wanted = true;  ///< false: up to date, nothing to make
};

/// One chunk of one product: steps [t0, t1) of the run's axis.
struct Piece {
  std::uint32_t product = 0, time_chunk = 0;
  std::size_t t0 = 0, t1 = 0;
};

/// A block of mesh cells (one chunk wide) with the pieces to make there. Regridding only: one piece (a tile);
/// adjusted: all pieces of a time segment (a column).
struct Unit {
  std::uint32_t block = 0;  ///< block_y * blocks_x + block_x
  std::vector<Piece> pieces;
};

/// Units that share one window of source values.
struct Batch {
  std::size_t t0 = 0, t1 = 0;          ///< source steps to hold (regridding only: the units' steps)
  std::vector<std::uint32_t> columns;  ///< source cells to hold, ascending
  std::vector<Unit> units;
};

struct StageNeeds {
  std::size_t ny = 1, nx = 1, steps = 1;
  std::size_t anchor_steps = 0;  ///< > 0: adjusted, with that many anchor steps held beside the run's own
  bool run_is_anchor = false;    ///< then nothing is held twice
  bool cover_varies = false;     ///< a second chunk for every tile
  std::size_t table_bytes = 0;   ///< fitted tables of one worker
  Chunk chunk;
  std::vector<ProductSpan> products;
  std::vector<std::vector<std::uint32_t>> block_columns;  ///< source cells each block needs, ascending
  std::int64_t memory = 0;       ///< ceiling for the whole process, bytes
  std::int64_t resident = 0;     ///< bytes held already: mesh, maps, libraries
  int threads = 1;
};

struct Stage {
  std::vector<Batch> batches;
  int threads = 1;                 ///< may be fewer than asked for, when memory is short
  std::int64_t worker_bytes = 0;   ///< largest need of one worker
  std::int64_t source_bytes = 0;   ///< largest source window
  std::int64_t bound = 0;          ///< resident + source + threads * worker
  std::size_t pieces = 0;
};

/// Error(job) when not even one worker with the smallest window fits: names the ceiling and what would be needed.
Stage make_stage(const StageNeeds& needs, const std::string& place);

}  // namespace windrow::plan
