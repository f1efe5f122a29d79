// From overlaps to a LinearMap.
#include <fmt/format.h>

#include "closure.h"
#include "overlaps.h"
#include "windrow/base/error.h"

namespace windrow::overlap {
namespace {

using linear_map::LinearMap;
using linear_map::Quantity;

LinearMap start(const mesh::Mesh& source, const mesh::Mesh& target, Quantity quantity, const char* method) {
  LinearMap map;
  map.quantity = quantity;
  map.columns = map.value_columns = source.size();
  map.provenance = fmt::format("{}; from {}; to {}", method, source.describe(), target.describe());
  for (std::size_t k = 0; k < source.size(); ++k) map.column_area.push_back(source.area(k));
  for (std::size_t k = 0; k < target.size(); ++k) map.row_area.push_back(target.area(k));
  map.row_start.push_back(0);
  return map;
}

// Shares of one row: overlaps, and with `moments` two more blocks of columns behind the values.
void add_row(LinearMap& map, const Pairing* pairings, const Moment* moments, std::size_t count) {
  const double row_area = map.row_area[map.row_start.size() - 1];
  const auto whole = [&](std::uint32_t column) {
    return map.quantity == Quantity::mean ? row_area : map.column_area[column];
  };
  for (std::size_t n = 0; n < count; ++n) {
    map.column.push_back(pairings[n].column);
    map.share.push_back(pairings[n].area / whole(pairings[n].column));
  }
  const auto cells = static_cast<std::uint32_t>(map.value_columns);
  for (std::size_t along = 0; moments != nullptr && along < 2; ++along) {
    for (std::size_t n = 0; n < count; ++n) {
      map.column.push_back(pairings[n].column + cells * static_cast<std::uint32_t>(along + 1));
      map.share.push_back(moments[n][along] / whole(pairings[n].column));
    }
  }
  map.row_start.push_back(map.column.size());
}

void fill(LinearMap& map, std::vector<Rows>& blocks) {
  std::size_t pairings = 0;
  for (const Rows& block : blocks) pairings += block.pairings.size() + 2 * block.moments.size();
  map.row_start.reserve(map.row_area.size() + 1);
  map.column.reserve(pairings);
  map.share.reserve(pairings);
  for (Rows& block : blocks) {
    std::size_t p = 0;
    for (const std::uint32_t count : block.count) {
      add_row(map, block.pairings.data() + p, block.moments.empty() ? nullptr : block.moments.data() + p, count);
      p += count;
    }
    block = {};
  }
}

}  // namespace

Result conservative(const mesh::Mesh& source, const mesh::Mesh& target, Quantity quantity) {
  std::vector<Rows> blocks = overlaps(source, target, nullptr);
  Result result;
  result.closure = check_closure(blocks, source, target);
  result.map = start(source, target, quantity, "conservative, piecewise constant");
  fill(result.map, blocks);
  return result;
}

Result conservative_linear(const mesh::Mesh& source, const mesh::Mesh& target, Quantity quantity) {
  constexpr std::size_t kMostCells = 0xffffffffU / 3;
  if (source.size() > kMostCells) {
    throw Error(Failure::data, source.describe(), "has more cells than a map with gradients can number (2^32 / 3)");
  }
  const Centroids centre = centroids(source);
  std::vector<Rows> blocks = overlaps(source, target, &centre);
  Result result;
  result.closure = check_closure(blocks, source, target);
  result.map = start(source, target, quantity, "conservative, piecewise linear");
  result.map.columns = 3 * source.size();
  fill(result.map, blocks);
  return result;
}

linear_map::LinearMap containing(const mesh::Mesh& source, const std::vector<GeoPoint>& points) {
  linear_map::LinearMap map;
  map.columns = map.value_columns = source.size();
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
