// Cuts a request for some cells over some steps of one file into hyperslabs: whole chunks where the file is chunked,
// in the file's own order, each within a memory bound.
#pragma once
#include <cstddef>
#include <vector>

namespace windrow::cf {

/// Where time and the (at most two) horizontal dimensions stand in a variable's dimension list, and how it is stored.
struct Storage {
  std::ptrdiff_t time = -1, y = -1, x = -1;  ///< -1: none
  std::vector<std::size_t> lengths, chunks;  ///< of every dimension; chunks empty when contiguous
  std::size_t value_bytes = 4;
  [[nodiscard]] std::size_t length(std::ptrdiff_t dim) const { return dim >= 0 ? lengths[dim] : 1; }
};

struct ArrayCell {
  std::size_t y = 0, x = 0;  ///< array positions
  std::size_t target = 0;    ///< number in the request
};

struct Window {
  std::size_t y0 = 0, y1 = 0, x0 = 0, x1 = 0;  ///< the smallest that holds its cells
  std::vector<ArrayCell> cells;
};

struct Block {
  std::size_t window = 0;  ///< in Blocks::windows
  std::size_t t0 = 0, t1 = 0;
};

struct Blocks {
  std::vector<Window> windows;  ///< disjoint; every cell is in one
  std::vector<Block> blocks;    ///< in the order of the file
};

/// A block holds at most `max_bytes`, unless a single chunk is larger.
Blocks cut(const Storage& storage, const std::vector<ArrayCell>& cells, std::size_t t0, std::size_t t1,
           std::size_t max_bytes);

}  // namespace windrow::cf
