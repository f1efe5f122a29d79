#include "windrow/pipeline/tile_stats.h"

#include <algorithm>

#include "windrow/base/byte_record.h"
#include "windrow/codec/codec.h"

namespace windrow::pipeline {
void TileStats::resize(std::size_t step_count, std::size_t cells) {
  steps = step_count;
  for (std::size_t i = 0; i < kIntegrals; ++i) {
    high[i].assign(steps, 0.0);
    low[i].assign(steps, 0.0);
  }
  count.fill(0);
  minimum = 3.4e38F;
  maximum = -3.4e38F;
  flags.assign(cells, 0);
}

void TileStats::add(const TileStats& other, std::size_t t0) {
  for (std::size_t i = 0; i < kIntegrals; ++i) {
    for (std::size_t t = 0; t < other.steps; ++t) {
      high[i][t0 + t] += other.high[i][t];
      low[i][t0 + t] += other.low[i][t];
    }
  }
  for (std::size_t i = 0; i < kCounts; ++i) count[i] += other.count[i];
  minimum = std::min(minimum, other.minimum);
  maximum = std::max(maximum, other.maximum);
}

std::vector<std::byte> serialise(const TileStats& stats) {
  std::vector<std::byte> raw;
  const std::array<std::uint64_t, 2> sizes{stats.steps, stats.flags.size()};
  put_values(raw, stats.count.data(), stats.count.size());
  put_values(raw, &stats.minimum, 1);
  put_values(raw, &stats.maximum, 1);
  for (std::size_t i = 0; i < kIntegrals; ++i) {
    put_values(raw, stats.high[i].data(), stats.steps);
    put_values(raw, stats.low[i].data(), stats.steps);
  }
  put_values(raw, stats.flags.data(), stats.flags.size());
  const auto packed = codec::zstd_compress(raw);
  std::vector<std::byte> out;
  put_values(out, sizes.data(), sizes.size());
  put_values(out, packed.data(), packed.size());
  return out;
}

bool parse(std::span<const std::byte> bytes, TileStats& stats) {
  std::array<std::uint64_t, 2> sizes{};
  constexpr std::uint64_t kMost = 1ULL << 28;
  RecordReader head(bytes);
  if (!head.get(sizes.data(), sizes.size()) || sizes[0] > kMost || sizes[1] > kMost) return false;
  stats.resize(sizes[0], sizes[1]);
  std::vector<std::byte> raw(sizeof(std::uint64_t) * kCounts + 2 * sizeof(float) +
                             2 * kIntegrals * sizeof(double) * sizes[0] + sizes[1]);
  if (!codec::zstd_expand(head.rest(), raw)) return false;
  RecordReader rest(raw);
  bool good = rest.get(stats.count.data(), stats.count.size()) && rest.get(&stats.minimum, 1) &&
              rest.get(&stats.maximum, 1);
  for (std::size_t i = 0; good && i < kIntegrals; ++i) {
    good = rest.get(stats.high[i].data(), stats.steps) && rest.get(stats.low[i].data(), stats.steps);
  }
  return good && rest.get(stats.flags.data(), stats.flags.size()) && rest.rest().empty();
}

}  // namespace windrow::pipeline
