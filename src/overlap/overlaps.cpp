// Chooses the way: closed form, wedges and bands, or cell against cell; and turns rows into columns where the source's
// cells were the ones to be clipped.
#include "overlaps.h"

#include <fmt/format.h>
#include <omp.h>

#include <algorithm>
#include <exception>

#include "convex.h"
#include "frame_view.h"
#include "latlon_pair.h"
#include "over_cells.h"
#include "over_latlon.h"
#include "windrow/base/error.h"

namespace windrow::overlap {
namespace {

// Cells a task; results do not depend on it. Long runs meet the same cells of the other mesh again, but every thread
// wants some.
std::size_t run_of(std::size_t cells) { return std::clamp<std::size_t>(cells / 64, 64, 16384); }

// `make_rows_of` makes what finds the rows [first, last) of a run; every thread makes its own.
template <typename MakeRowsOf>
std::vector<Rows> all_rows(std::size_t cells, const MakeRowsOf& make_rows_of) {
  const std::size_t run = run_of(cells);
  std::vector<Rows> blocks((cells + run - 1) / run);
  std::vector<std::exception_ptr> failures(blocks.size());
  std::vector<decltype(make_rows_of())> rows_of;
  for (int thread = 0; thread < omp_get_max_threads(); ++thread) rows_of.push_back(make_rows_of());
#pragma omp parallel for schedule(dynamic)
  for (std::size_t b = 0; b < blocks.size(); ++b) {
    try {
      blocks[b] = rows_of[static_cast<std::size_t>(omp_get_thread_num())](b * run, std::min(cells, (b + 1) * run));
    } catch (...) {
      failures[b] = std::current_exception();
    }
  }
  for (const std::exception_ptr& failure : failures) {
    if (failure) std::rethrow_exception(failure);
  }
  return blocks;
}

// Rows of the source's cells become rows of the target's. Sources stay ascending within a row.
Rows turned(const std::vector<Rows>& blocks, const mesh::Mesh& source, const mesh::Mesh& target) {
  Rows out;
  const std::size_t rows = target.size();
  out.count.assign(rows, 0);
  for (const Rows& block : blocks) {
    for (const Pairing& pairing : block.pairings) ++out.count[pairing.column];
  }
  std::vector<std::size_t> next(rows, 0);
  std::size_t all = 0;
  for (std::size_t row = 0; row < rows; ++row) {
    next[row] = all;
    all += out.count[row];
  }
  out.pairings.resize(all);
  out.covered.assign(rows, 1);
  const bool moments = std::any_of(blocks.begin(), blocks.end(), [](const Rows& b) { return !b.moments.empty(); });
  if (moments) out.moments.resize(all);
  std::uint32_t cell = 0;
  for (const Rows& block : blocks) {
    std::size_t p = 0;
    for (const std::uint32_t count : block.count) {
      const bool open = source.on_rim(cell);
      for (std::uint32_t n = 0; n < count; ++n, ++p) {
        const std::uint32_t row = block.pairings[p].column;
        if (moments) out.moments[next[row]] = block.moments[p];
        out.pairings[next[row]++] = {cell, block.pairings[p].area};
        if (open) out.covered[row] = 0;
      }
      ++cell;
    }
  }
  for (std::size_t row = 0; row < rows; ++row) {
    if (out.count[row] == 0) out.covered[row] = 0;
    out.bound.push_back(closure_bound(target.perimeter(row), target.area(row)));
  }
  return out;
}

bool same_frame(const mesh::Mesh& a, const mesh::Mesh& b) {
  const mesh::Rotation* ra = a.rotation();
  const mesh::Rotation* rb = b.rotation();
  return (ra == nullptr) == (rb == nullptr) && (ra == nullptr || *ra == *rb);
}

// `cells` against a latitude-longitude block, in the block's own frame.
std::vector<Rows> against_block(const mesh::Mesh& block, const mesh::Mesh& cells, const MomentFrame& frame) {
  const SourceBlock wedges(block);
  if (block.rotation() == nullptr) {
    return all_rows(cells.size(), [&] {
      return [&](std::size_t first, std::size_t last) { return over_latlon(wedges, cells, frame, first, last); };
    });
  }
  const FrameView view(cells, *block.rotation());
  const mesh::Frame into(*block.rotation());
  Centroids turned_centroids;
  MomentFrame turned_frame = frame;
  if (frame.source != nullptr) {
    for (const auto& v : frame.source->direction) turned_centroids.direction.push_back(into.to_frame(v));
    for (const auto& v : frame.source->first) turned_centroids.first.push_back(into.to_frame(v));
    for (const auto& v : frame.source->second) turned_centroids.second.push_back(into.to_frame(v));
    turned_frame.source = &turned_centroids;
  }
  return all_rows(cells.size(), [&] {
    return [&](std::size_t first, std::size_t last) { return over_latlon(wedges, view, turned_frame, first, last); };
  });
}

std::vector<Rows> against_cells(const mesh::Mesh& clip, const mesh::Mesh& cells, const MomentFrame& frame) {
  const mesh::Index index(clip);
  return all_rows(cells.size(), [&] { return over_cells(clip, index, cells, frame); });
}

// Can cells of the mesh clip as they are, without being taken apart? Told from some of them.
bool convex_cells(const mesh::Mesh& mesh) {
  constexpr std::size_t kSamples = 50;
  const std::size_t step = std::max<std::size_t>(1, mesh.size() / kSamples);
  sphere::Polygon polygon;
  CellParts parts;
  for (std::size_t k = 0; k < mesh.size(); k += step) {
    mesh.cell_into(k, polygon);
    find_sides(polygon, parts);
    if (!parts.convex) return false;
  }
  return true;
}

double mean_area(const mesh::Mesh& mesh) {
  double sum = 0;
  const std::size_t step = std::max<std::size_t>(1, mesh.size() / 1000);
  std::size_t count = 0;
  for (std::size_t k = 0; k < mesh.size(); k += step, ++count) sum += mesh.area(k);
  return sum / static_cast<double>(count);
}

// Blocks clip whatever the other mesh is. Of two others the finer one is clipped: most of its cells lie within one of
// the other's. Only convex cells clip quickly, so of like sizes they do it; and polygons of many corners never do.
bool target_is_to_clip(const mesh::Mesh& source, const mesh::Mesh& target) {
  constexpr double kLikeSize = 4;
  const double ratio = mean_area(target) / mean_area(source);
  if (target.latlon() != nullptr) return source.latlon() == nullptr || ratio > 1;
  if (source.latlon() != nullptr || target.cells_may_overlap()) return false;
  if (std::max(ratio, 1 / ratio) < kLikeSize) {
    const bool source_convex = convex_cells(source), target_convex = convex_cells(target);
    if (source_convex != target_convex) return target_convex;
  }
  return ratio > 1;
}

void check(const mesh::Mesh& mesh) {
  if (!mesh.has_area()) {
    throw Error(Failure::data, mesh.describe(),
                "have no area, which conservative methods need; expected method bilinear or nearest, or grid = { "
                "coordinates = \"...\" } naming a file with the cells' corners");
  }
  if (mesh.size() > std::numeric_limits<std::uint32_t>::max()) {
    throw Error(Failure::data, mesh.describe(), "has more cells than a linear map can number (2^32)");
  }
}

}  // namespace

std::vector<Rows> overlaps(const mesh::Mesh& source, const mesh::Mesh& target, const Centroids* centroids) {
  check(source);
  check(target);
  const bool both = source.latlon() != nullptr && target.latlon() != nullptr;
  if (both && centroids == nullptr && same_frame(source, target)) {
    const LatLonPair pair(source, target);
    return all_rows(target.size(),
                    [&] { return [&](std::size_t first, std::size_t last) { return pair.rows(first, last); }; });
  }
  const bool target_clips = target_is_to_clip(source, target);
  const MomentFrame frame{centroids, target_clips};
  if (!target_clips) {
    return source.latlon() != nullptr ? against_block(source, target, frame) : against_cells(source, target, frame);
  }
  const std::vector<Rows> blocks =
      target.latlon() != nullptr ? against_block(target, source, frame) : against_cells(target, source, frame);
  std::vector<Rows> out;
  out.push_back(turned(blocks, source, target));
  return out;
}

}  // namespace windrow::overlap
