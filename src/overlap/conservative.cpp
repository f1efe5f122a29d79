// From overlaps to a LinearMap: runs of target cells in parallel, put together in order.
#include <fmt/format.h>

#include <algorithm>
#include <exception>

#include "closure.h"
#include "latlon_pair.h"
#include "over_latlon.h"
#include "windrow/base/error.h"

namespace windrow::overlap {
namespace {

constexpr std::size_t kRun = 2048;  // target cells a task; results do not depend on it

std::vector<Rows> all_rows(std::size_t cells, const auto& rows_of) {
  std::vector<Rows> blocks((cells + kRun - 1) / kRun);
  std::vector<std::exception_ptr> failures(blocks.size());
#pragma omp parallel for schedule(dynamic)
  for (std::size_t b = 0; b < blocks.size(); ++b) {
    try {
      blocks[b] = rows_of(b * kRun, std::min(cells, (b + 1) * kRun));
    } catch (...) {
      failures[b] = std::current_exception();
    }
  }
  for (const std::exception_ptr& failure : failures) {
    if (failure) std::rethrow_exception(failure);
  }
  return blocks;
}

linear_map::LinearMap to_map(std::vector<Rows>& blocks, const mesh::Mesh& source, const mesh::Mesh& target,
                             linear_map::Quantity quantity) {
  linear_map::LinearMap map;
  map.quantity = quantity;
  map.columns = source.size();
  map.provenance =
      fmt::format("conservative, piecewise constant; from {}; to {}", source.describe(), target.describe());
  std::size_t pairings = 0;
  for (const Rows& block : blocks) pairings += block.pairings.size();
  map.row_start.reserve(target.size() + 1);
  map.column.reserve(pairings);
  map.share.reserve(pairings);
  for (std::size_t k = 0; k < source.size(); ++k) map.column_area.push_back(source.area(k));
  for (std::size_t k = 0; k < target.size(); ++k) map.row_area.push_back(target.area(k));
  map.row_start.push_back(0);
  for (Rows& block : blocks) {
    std::size_t p = 0;
    for (const std::uint32_t count : block.count) {
      const double row_area = map.row_area[map.row_start.size() - 1];
      for (std::uint32_t n = 0; n < count; ++n, ++p) {
        const Pairing& pairing = block.pairings[p];
        const double whole = quantity == linear_map::Quantity::mean ? row_area : map.column_area[pairing.column];
        map.column.push_back(pairing.column);
        map.share.push_back(pairing.area / whole);
      }
      map.row_start.push_back(map.column.size());
    }
    block = {};
  }
  return map;
}

}  // namespace

Result conservative(const mesh::Mesh& source, const mesh::Mesh& target, linear_map::Quantity quantity) {
  if (source.latlon() == nullptr) {
    throw Error(Failure::data, source.describe(),
                "is no latitude-longitude grid: conservative regridding reads latitude-longitude sources only");
  }
  if (source.size() > std::numeric_limits<std::uint32_t>::max()) {
    throw Error(Failure::data, source.describe(), "has more cells than a linear map can number (2^32)");
  }
  std::vector<Rows> blocks;
  if (target.latlon() != nullptr) {
    const LatLonPair pair(source, target);
    blocks = all_rows(target.size(), [&](std::size_t first, std::size_t last) { return pair.rows(first, last); });
  } else {
    const SourceBlock block(source);
    blocks = all_rows(target.size(),
                      [&](std::size_t first, std::size_t last) { return over_latlon(block, target, first, last); });
  }
  Result result;
  result.closure = check_closure(blocks, source, target);
  result.map = to_map(blocks, source, target, quantity);
  return result;
}

linear_map::LinearMap containing(const mesh::Mesh& source, const std::vector<GeoPoint>& points) {
  linear_map::LinearMap map;
  map.columns = source.size();
  map.provenance = fmt::format("containing cell; from {}; to {} points", source.describe(), points.size());
  map.row_start.push_back(0);
  for (const GeoPoint& point : points) {
    if (const std::optional<std::size_t> cell = source.find(point)) {
      map.column.push_back(static_cast<std::uint32_t>(*cell));
      map.share.push_back(1);
    }
    map.row_start.push_back(map.column.size());
  }
  return map;
}

}  // namespace windrow::overlap
