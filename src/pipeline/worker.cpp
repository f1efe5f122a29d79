#include "worker.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>

namespace windrow::pipeline {
namespace {
std::size_t blocks_along(std::size_t length, std::size_t chunk) { return (length + chunk - 1) / chunk; }
}  // namespace

std::uint32_t blocks_of(const StageInput& input) {
  return static_cast<std::uint32_t>(blocks_along(input.ny, input.chunk.y) * blocks_along(input.nx, input.chunk.x));
}

Block block_of(const StageInput& input, std::uint32_t index) {
  const std::size_t across = blocks_along(input.nx, input.chunk.x);
  const std::size_t y0 = index / across * input.chunk.y, x0 = index % across * input.chunk.x;
  return {y0, std::min(input.ny, y0 + input.chunk.y), x0, std::min(input.nx, x0 + input.chunk.x)};
}

std::uint32_t chunk_index(const StageInput& input, const plan::Piece& piece, std::uint32_t block) {
  return piece.time_chunk * blocks_of(input) + block;
}

ChunkEncoder::ChunkEncoder(const StageInput& input, Spool& spool) : input_(input), spool_(spool) {
  const std::size_t count = input.chunk.time * input.chunk.y * input.chunk.x;
  raw_.resize(count);
  if (input.level > 0) {
    deflater_ = std::make_unique<codec::Deflater>(input.level);
    shuffled_.resize(count * sizeof(float));
  }
}

float* ChunkEncoder::begin_chunk() {
  std::fill(raw_.begin(), raw_.end(), input_.field.missing);
  return raw_.data();
}

void ChunkEncoder::append(const TileId& id, const TileStats* stats) {
  const auto bytes = std::as_bytes(std::span<const float>(raw_));
  const auto aux = stats != nullptr ? serialise(*stats) : std::vector<std::byte>{};
  if (deflater_) {
    codec::shuffle(bytes, sizeof(float), shuffled_);
    deflater_->compress(shuffled_, packed_);
    spool_.append(id, codec::digest(bytes), packed_, aux);
  } else {
    spool_.append(id, codec::digest(bytes), bytes, aux);
  }
}

double balance_factor(const StageInput& input, std::size_t row) {
  if (input.weights->all_surface[row] != 0) return 0.0;
  const auto& map = *input.weights->map;
  return map.quantity == linear_map::Quantity::mean ? map.row_area[row] : 1.0;
}

double least_cover(const StageInput& input, std::size_t row) {
  constexpr double kNever = 2.0;  // no cover reaches it
  return input.weights->row_fraction[row] >= input.field.min_land ? input.field.min_cover - kCoverTolerance : kNever;
}

void round_bits(float* values, std::size_t count, int bits, float missing) {
  const int drop = 23 - bits;
  const std::uint32_t half = (1U << drop) >> 1, mask = ~((1U << drop) - 1U);
  for (std::size_t i = 0; i < count; ++i) {
    if (values[i] == missing) continue;
    const auto word = std::bit_cast<std::uint32_t>(values[i]);
    values[i] = std::bit_cast<float>((word + half - 1U + ((word >> drop) & 1U)) & mask);
  }
}

void add_extremes(const float* values, std::size_t count, float missing, TileStats& stats) {
  float low = stats.minimum, high = stats.maximum;
  for (std::size_t i = 0; i < count; ++i) {
    const float x = values[i];
    const bool has = x != missing;
    low = has && x < low ? x : low;
    high = has && x > high ? x : high;
  }
  stats.minimum = low;
  stats.maximum = high;
}

double fill_value(const StageInput& input, std::size_t row, const linear_map::SourceBlock& source, std::size_t step) {
  for (std::size_t k = 0; k < FillCandidates::kPerRow; ++k) {
    const std::uint32_t column = input.fill.column[row * FillCandidates::kPerRow + k];
    if (column == linear_map::SourceBlock::kNotHeld) break;
    const double x = source.at(step, source.slot[column]);
    if (!std::isnan(x)) return x;
  }
  return std::numeric_limits<double>::quiet_NaN();
}

}  // namespace windrow::pipeline
