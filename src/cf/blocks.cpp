// Cutting requests along chunks, so that the library decodes every chunk once.
#include "blocks.h"

#include <algorithm>
#include <tuple>

namespace windrow::cf {

namespace {

/// Chunk columns [cy0, cy1) x [cx0, cx1) of the horizontal chunk grid.
struct Rectangle {
  std::size_t cy0, cy1, cx0, cx1;
};

/// The chunk lengths that matter; contiguous data are cut as if stored in small blocks of rows.
struct ChunkGrid {
  std::size_t t = 1, y = 16, x = 64, ny = 0, nx = 0;
  explicit ChunkGrid(const Storage& storage) {
    if (storage.x < 0) y = 1024, x = 1;
    if (!storage.chunks.empty()) {
      const auto along = [&](std::ptrdiff_t dim) { return dim >= 0 ? storage.chunks[dim] : 1; };
      t = along(storage.time);
      y = along(storage.y);
      x = along(storage.x);
    }
    ny = (storage.length(storage.y) + y - 1) / y;
    nx = (storage.length(storage.x) + x - 1) / x;
  }
};

/// Runs of needed chunks in a row, joined downwards while the next row needs the same run.
std::vector<Rectangle> needed_rectangles(const ChunkGrid& grid, const std::vector<bool>& needed) {
  std::vector<Rectangle> open, done;
  for (std::size_t cy = 0; cy < grid.ny; ++cy) {
    std::vector<Rectangle> row;
    for (std::size_t cx = 0; cx < grid.nx; ++cx) {
      if (!needed[cy * grid.nx + cx]) continue;
      if (!row.empty() && row.back().cx1 == cx)
        row.back().cx1 = cx + 1;
      else
        row.push_back({cy, cy + 1, cx, cx + 1});
    }
    std::vector<Rectangle> still_open;
    for (Rectangle& rectangle : open) {
      const auto same = std::ranges::find_if(
          row, [&](const Rectangle& r) { return r.cx0 == rectangle.cx0 && r.cx1 == rectangle.cx1; });
      if (same == row.end()) {
        done.push_back(rectangle);
      } else {
        rectangle.cy1 = cy + 1;
        still_open.push_back(rectangle);
        row.erase(same);
      }
    }
    still_open.insert(still_open.end(), row.begin(), row.end());
    open = std::move(still_open);
  }
  done.insert(done.end(), open.begin(), open.end());
  return done;
}

/// Halves a rectangle until one time chunk of it fits, or it is one chunk.
void split(const ChunkGrid& grid, std::size_t step_bytes, std::size_t max_bytes, const Rectangle& r,
           std::vector<Rectangle>& out) {
  const std::size_t rows = r.cy1 - r.cy0, columns = r.cx1 - r.cx0;
  if (rows * grid.y * columns * grid.x * step_bytes <= max_bytes || rows * columns == 1) {
    out.push_back(r);
  } else if (rows > 1) {
    const std::size_t middle = r.cy0 + rows / 2;
    split(grid, step_bytes, max_bytes, {r.cy0, middle, r.cx0, r.cx1}, out);
    split(grid, step_bytes, max_bytes, {middle, r.cy1, r.cx0, r.cx1}, out);
  } else {
    const std::size_t middle = r.cx0 + columns / 2;
    split(grid, step_bytes, max_bytes, {r.cy0, r.cy1, r.cx0, middle}, out);
    split(grid, step_bytes, max_bytes, {r.cy0, r.cy1, middle, r.cx1}, out);
  }
}

}  // namespace

Blocks cut(const Storage& storage, const std::vector<ArrayCell>& cells, std::size_t t0, std::size_t t1,
           std::size_t max_bytes) {
  const ChunkGrid grid(storage);
  std::vector<bool> needed(grid.ny * grid.nx, false);
  for (const ArrayCell& cell : cells) needed[cell.y / grid.y * grid.nx + cell.x / grid.x] = true;
  std::vector<Rectangle> rectangles;
  const std::size_t step_bytes = std::min(grid.t, t1 - t0) * storage.value_bytes;
  for (const Rectangle& r : needed_rectangles(grid, needed)) split(grid, step_bytes, max_bytes, r, rectangles);

  Blocks result;
  std::vector<std::size_t> window_of(grid.ny * grid.nx, 0);
  for (std::size_t w = 0; w < rectangles.size(); ++w)
    for (std::size_t cy = rectangles[w].cy0; cy < rectangles[w].cy1; ++cy)
      for (std::size_t cx = rectangles[w].cx0; cx < rectangles[w].cx1; ++cx) window_of[cy * grid.nx + cx] = w;
  result.windows.resize(rectangles.size());
  for (const ArrayCell& cell : cells) {
    Window& window = result.windows[window_of[cell.y / grid.y * grid.nx + cell.x / grid.x]];
    if (window.cells.empty()) window.y0 = cell.y, window.x0 = cell.x;
    window.y0 = std::min(window.y0, cell.y);
    window.x0 = std::min(window.x0, cell.x);
    window.y1 = std::max(window.y1, cell.y + 1);
    window.x1 = std::max(window.x1, cell.x + 1);
    window.cells.push_back(cell);
  }

  for (std::size_t w = 0; w < result.windows.size(); ++w) {
    const Window& window = result.windows[w];
    const std::size_t bytes = (window.y1 - window.y0) * (window.x1 - window.x0) * storage.value_bytes;
    const std::size_t chunks = std::max<std::size_t>(max_bytes / bytes / grid.t, 1);
    for (std::size_t t = t0; t < t1;) {
      const std::size_t end = std::min(t1, (t / grid.t + chunks) * grid.t);
      result.blocks.push_back({w, t, end});
      t = end;
    }
  }
  const auto place = [&](const Block& block) {
    const Window& window = result.windows[block.window];
    std::vector<std::size_t> start(storage.lengths.size(), 0);
    if (storage.time >= 0) start[storage.time] = block.t0;
    if (storage.y >= 0) start[storage.y] = window.y0;
    if (storage.x >= 0) start[storage.x] = window.x0;
    return start;
  };
  std::ranges::stable_sort(result.blocks, {}, place);
  return result;
}

}  // namespace windrow::cf
