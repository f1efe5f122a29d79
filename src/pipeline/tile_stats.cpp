#include "windrow/pipeline/tile_stats.h"

#include <algorithm>
#include <cstring>

#include "windrow/codec/codec.h"

namespace windrow::pipeline {
namespace {

template <typename T>
void put(std::vector<std::byte>& out, const T* data, std::size_t count) {
  const std::size_t at = out.size();
  out.resize(at + count * sizeof(T));
  if (count > 0) std::memcpy(out.data() + at, data, count * sizeof(T));
}

template <typename T>
bool get(std::span<const std::byte>& rest, T* data, std::size_t count) {
  if (count > rest.size() / sizeof(T)) return false;
  if (count > 0) std::memcpy(data, rest.data(), count * sizeof(T));
  rest = rest.subspan(count * sizeof(T));
  return true;
}

}  // namespace

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
  put(raw, stats.count.data(), stats.count.size());
  put(raw, &stats.minimum, 1);
  put(raw, &stats.maximum, 1);
  for (std::size_t i = 0; i < kIntegrals; ++i) {
    put(raw, stats.high[i].data(), stats.steps);
    put(raw, stats.low[i].data(), stats.steps);
  }
  put(raw, stats.flags.data(), stats.flags.size());
  const auto packed = codec::zstd_compress(raw);
  std::vector<std::byte> out;
  put(out, sizes.data(), sizes.size());
  out.insert(out.end(), packed.begin(), packed.end());
  return out;
}

bool parse(std::span<const std::byte> bytes, TileStats& stats) {
  std::array<std::uint64_t, 2> sizes{};
  constexpr std::uint64_t kMost = 1ULL << 28;
  if (!get(bytes, sizes.data(), sizes.size()) || sizes[0] > kMost || sizes[1] > kMost) return false;
  stats.resize(sizes[0], sizes[1]);
  std::vector<std::byte> raw(sizeof(std::uint64_t) * kCounts + 2 * sizeof(float) +
                             2 * kIntegrals * sizeof(double) * sizes[0] + sizes[1]);
  if (!codec::zstd_expand(bytes, raw)) return false;
  std::span<const std::byte> rest(raw);
  bool good = get(rest, stats.count.data(), stats.count.size()) && get(rest, &stats.minimum, 1) &&
              get(rest, &stats.maximum, 1);
  for (std::size_t i = 0; good && i < kIntegrals; ++i) {
    good = get(rest, stats.high[i].data(), stats.steps) && get(rest, stats.low[i].data(), stats.steps);
  }
  return good && get(rest, stats.flags.data(), stats.flags.size()) && rest.empty();
}

}  // namespace windrow::pipeline
