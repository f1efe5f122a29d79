#include "windrow/plan/units.h"

#include <fmt/format.h>

#include <algorithm>
#include <set>

#include "windrow/base/error.h"

namespace windrow::plan {
namespace {

// 92 steps: four chunks hold any year of 365 or 366 days with at most three steps of padding.
constexpr std::size_t kDailyChunk = 92;
constexpr std::size_t kMonthlyChunk = 12;
// Blocks of about 0.8 MB for tiles; 20 x 20 cells x 150 years of days x 4 B = 88 MB for columns.
constexpr std::size_t kTileSide = 48, kColumnSide = 20;

std::size_t balanced(std::size_t length, std::size_t side) {
  const std::size_t count = (length + side - 1) / side;
  return (length + count - 1) / count;
}

std::vector<Piece> pieces_of(const StageNeeds& needs) {
  std::vector<Piece> out;
  for (std::size_t p = 0; p < needs.products.size(); ++p) {
    const auto& span = needs.products[p];
    if (!span.wanted) continue;
    std::uint32_t index = 0;
    for (std::size_t t = span.t0; t < span.t1; t += needs.chunk.time, ++index) {
      out.push_back({static_cast<std::uint32_t>(p), index, t, std::min(span.t1, t + needs.chunk.time)});
    }
  }
  return out;
}

std::vector<std::uint32_t> merged(const std::vector<std::uint32_t>& a, const std::vector<std::uint32_t>& b) {
  std::vector<std::uint32_t> out;
  out.reserve(a.size() + b.size());
  std::set_union(a.begin(), a.end(), b.begin(), b.end(), std::back_inserter(out));
  return out;
}

std::vector<std::uint32_t> all_columns(const StageNeeds& needs) {
  std::set<std::uint32_t> set;
  for (const auto& columns : needs.block_columns) set.insert(columns.begin(), columns.end());
  return {set.begin(), set.end()};
}

/// Raw tile, its shuffled form and the compressed stream (never larger by more than a small header).
std::int64_t chunk_bytes(const StageNeeds& needs) {
  const auto raw = static_cast<std::int64_t>(needs.chunk.time * needs.chunk.y * needs.chunk.x * 4);
  return raw * (needs.cover_varies ? 4 : 3) + (1 << 20);
}

[[noreturn]] void too_little(const std::string& place, std::int64_t memory, std::int64_t need) {
  constexpr double kMiB = 1024.0 * 1024.0;
  throw Error(Failure::job, place,
              fmt::format("memory = {:.0f} MiB is too little; at least {:.0f} MiB are needed",
                          static_cast<double>(memory) / kMiB, static_cast<double>(need) / kMiB + 1));
}

/// Tiles: batches follow time; all columns are held for as many steps as a third of the ceiling takes.
void tile_batches(const StageNeeds& needs, const std::vector<Piece>& pieces, std::int64_t budget, Stage& stage) {
  const auto columns = all_columns(needs);
  const auto step_bytes = static_cast<std::int64_t>(columns.size()) * 8;
  const auto blocks = static_cast<std::uint32_t>(needs.block_columns.size());
  std::size_t first = 0;
  while (first < pieces.size()) {
    std::size_t last = first + 1;
    while (last < pieces.size() &&
           static_cast<std::int64_t>(pieces[last].t1 - pieces[first].t0) * step_bytes <= budget) {
      ++last;
    }
    Batch batch;
    batch.t0 = pieces[first].t0;
    batch.t1 = pieces[last - 1].t1;
    batch.columns = columns;
    for (std::size_t i = first; i < last; ++i) {
      for (std::uint32_t b = 0; b < blocks; ++b) batch.units.push_back({b, {pieces[i]}});
    }
    stage.source_bytes =
        std::max(stage.source_bytes, static_cast<std::int64_t>(batch.t1 - batch.t0 + 8) * step_bytes);
    stage.batches.push_back(std::move(batch));
    first = last;
  }
}

/// Columns: batches follow blocks; the whole axis of the columns they need is held.
void column_batches(const StageNeeds& needs, const std::vector<std::vector<Piece>>& segments, std::int64_t budget,
                    Stage& stage) {
  const std::size_t held_steps = needs.steps + 8 + (needs.run_is_anchor ? 0 : needs.anchor_steps + 8);
  const auto column_bytes = static_cast<std::int64_t>(held_steps) * 8;
  std::size_t first = 0;
  while (first < needs.block_columns.size()) {
    std::vector<std::uint32_t> columns = needs.block_columns[first];
    std::size_t last = first + 1;
    while (last < needs.block_columns.size()) {
      auto wider = merged(columns, needs.block_columns[last]);
      if (static_cast<std::int64_t>(wider.size()) * column_bytes > budget) break;
      columns = std::move(wider);
      ++last;
    }
    Batch batch;
    batch.t0 = 0;
    batch.t1 = needs.steps;
    for (const auto& segment : segments) {
      for (std::size_t b = first; b < last; ++b) batch.units.push_back({static_cast<std::uint32_t>(b), segment});
    }
    stage.source_bytes = std::max(stage.source_bytes, static_cast<std::int64_t>(columns.size()) * column_bytes);
    batch.columns = std::move(columns);
    stage.batches.push_back(std::move(batch));
    first = last;
  }
}

/// Bytes of one column worker apart from its value buffer: the series, ranks and evaluation of one row.
std::int64_t row_bytes(const StageNeeds& needs) {
  return static_cast<std::int64_t>(needs.steps * 24 + needs.anchor_steps * 16 + needs.table_bytes);
}

/// Consecutive pieces cut so that a column buffer of one segment stays within `bytes`.
std::vector<std::vector<Piece>> cut(const std::vector<Piece>& pieces, std::size_t cells, std::int64_t bytes) {
  std::vector<std::vector<Piece>> out;
  std::int64_t used = 0;
  for (const auto& piece : pieces) {
    const auto need = static_cast<std::int64_t>((piece.t1 - piece.t0) * cells * 4);
    if (out.empty() || used + need > bytes) {
      out.emplace_back();
      used = 0;
    }
    out.back().push_back(piece);
    used += need;
  }
  return out;
}

}  // namespace

Chunk automatic_chunk(const ChunkNeeds& needs) {
  const std::size_t side = needs.adjusted ? kColumnSide : kTileSide;
  return {needs.fixed ? 1 : needs.monthly ? kMonthlyChunk : kDailyChunk, balanced(needs.ny, side),
          balanced(needs.nx, side)};
}

Stage make_stage(const StageNeeds& needs, const std::string& place) {
  Stage stage;
  const auto pieces = pieces_of(needs);
  stage.pieces = pieces.size() * needs.block_columns.size();
  if (pieces.empty()) return stage;
  const bool adjusted = needs.anchor_steps > 0;
  const std::int64_t available = needs.memory - needs.resident;
  const std::int64_t budget = std::max<std::int64_t>(available / 3, 0);
  const std::size_t cells = needs.chunk.y * needs.chunk.x;
  if (adjusted) {
    const std::int64_t fixed = chunk_bytes(needs) + row_bytes(needs);
    std::int64_t longest = 0, whole = 0;
    for (const auto& piece : pieces) {
      const auto need = static_cast<std::int64_t>((piece.t1 - piece.t0) * cells * 4);
      longest = std::max(longest, need);
      whole += need;
    }
    const std::int64_t room = available - budget;
    stage.threads = static_cast<int>(std::clamp<std::int64_t>(room / (fixed + longest), 0, needs.threads));
    if (stage.threads < 1) too_little(place, needs.memory, needs.resident + (fixed + longest) * 3 / 2);
    // Fewer workers with whole columns beat many with segments: every segment repeats the fitting.
    while (stage.threads > 1 && room / stage.threads - fixed < whole && room / (stage.threads - 1) - fixed >= whole) {
      --stage.threads;
    }
    const std::int64_t buffer = std::max(longest, room / stage.threads - fixed);
    column_batches(needs, cut(pieces, cells, buffer), budget, stage);
    stage.worker_bytes = fixed + std::min(buffer, whole);
  } else {
    stage.worker_bytes = chunk_bytes(needs);
    stage.threads = static_cast<int>(
        std::clamp<std::int64_t>((available - budget) / stage.worker_bytes, 0, needs.threads));
    if (stage.threads < 1) too_little(place, needs.memory, needs.resident + stage.worker_bytes * 3 / 2);
    tile_batches(needs, pieces, budget, stage);
  }
  stage.bound = needs.resident + stage.source_bytes + stage.threads * stage.worker_bytes;
  if (stage.bound > needs.memory) too_little(place, needs.memory, stage.bound);
  return stage;
}

}  // namespace windrow::plan
