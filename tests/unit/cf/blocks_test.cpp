// Laws of cutting: every wanted value is read once, every chunk is decoded once, no block is larger than allowed.
#include "cf/blocks.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cstdint>
#include <map>
#include <set>

using namespace windrow::cf;

namespace {

std::uint64_t state = 31;  // pinned seed
std::size_t below(std::size_t n) {
  state = state * 6364136223846793005ULL + 1442695040888963407ULL;
  return std::size_t((state >> 33) % n);
}

Storage random_storage() {
  Storage storage;
  storage.lengths = {1 + below(60), 1 + below(50), 1 + below(90)};
  std::vector<std::size_t> order = {0, 1, 2};
  std::swap(order[0], order[below(3)]);
  storage.time = std::ptrdiff_t(order[0]);
  storage.y = std::ptrdiff_t(order[1]);
  storage.x = std::ptrdiff_t(order[2]);
  if (below(3) > 0)
    for (const std::size_t length : storage.lengths) storage.chunks.push_back(1 + below(length));
  return storage;
}

}  // namespace

TEST_CASE("every cell and step is in exactly one block, within its window") {
  for (int round = 0; round < 300; ++round) {
    const Storage storage = random_storage();
    const std::size_t nt = storage.lengths[storage.time], ny = storage.length(storage.y),
                      nx = storage.length(storage.x);
    std::vector<ArrayCell> cells;
    const std::size_t sparse = 1 + below(20);
    for (std::size_t y = 0; y < ny; ++y)
      for (std::size_t x = 0; x < nx; ++x)
        if (below(sparse) == 0) cells.push_back({y, x, cells.size()});
    const std::size_t t0 = below(nt), t1 = t0 + 1 + below(nt - t0);
    const std::size_t limit = 64 + below(20000);
    const Blocks blocks = cut(storage, cells, t0, t1, limit);

    std::map<std::pair<std::size_t, std::size_t>, int> seen;
    std::map<std::vector<std::size_t>, std::size_t> chunk_reads;
    for (const Block& block : blocks.blocks) {
      const Window& window = blocks.windows[block.window];
      REQUIRE(block.t0 < block.t1);
      for (const ArrayCell& cell : window.cells) {
        const bool inside = window.y0 <= cell.y && cell.y < window.y1 && window.x0 <= cell.x && cell.x < window.x1;
        REQUIRE(inside);
        for (std::size_t t = block.t0; t < block.t1; ++t) ++seen[{cell.target, t}];
      }
      const std::size_t values = (block.t1 - block.t0) * (window.y1 - window.y0) * (window.x1 - window.x0);
      if (storage.chunks.empty()) continue;
      std::set<std::vector<std::size_t>> touched;
      for (const std::size_t t : {block.t0, block.t1 - 1})
        for (std::size_t y = window.y0; y < window.y1; ++y)
          for (std::size_t x = window.x0; x < window.x1; ++x)
            touched.insert(
                {t / storage.chunks[storage.time], y / storage.chunks[storage.y], x / storage.chunks[storage.x]});
      for (const auto& chunk : touched) ++chunk_reads[chunk];
      const bool within = values * storage.value_bytes <= limit || touched.size() == 1;
      REQUIRE(within);
    }
    REQUIRE(seen.size() == cells.size() * (t1 - t0));
    REQUIRE(std::ranges::all_of(seen, [](const auto& entry) { return entry.second == 1; }));
    REQUIRE(std::ranges::all_of(chunk_reads, [](const auto& entry) { return entry.second == 1; }));
  }
}

TEST_CASE("blocks follow the file: along its slowest dimension first") {
  Storage storage;
  storage.lengths = {40, 20, 20};
  storage.chunks = {10, 10, 10};
  storage.time = 0;
  storage.y = 1;
  storage.x = 2;
  std::vector<ArrayCell> corners = {{0, 0, 0}, {0, 19, 1}, {19, 0, 2}, {19, 19, 3}};
  const Blocks blocks = cut(storage, corners, 0, 40, 40);
  for (std::size_t i = 1; i < blocks.blocks.size(); ++i) CHECK(blocks.blocks[i - 1].t0 <= blocks.blocks[i].t0);
}
