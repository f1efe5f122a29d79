// Shapes, chunk grids and byte forms of what a product holds.
#include "product_layout.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstdint>
#include <cstring>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::cf {

static_assert(std::endian::native == std::endian::little, "chunks are written little-endian without swapping");

namespace {

const Dimension& dimension(const ProductFile& product, const std::string& name) {
  const auto found = std::find_if(product.dimensions.begin(), product.dimensions.end(),
                                  [&](const Dimension& d) { return d.name == name; });
  if (found == product.dimensions.end())
    throw Error(Failure::defect, "product", fmt::format("dimension '{}' is not declared", name));
  return *found;
}

template <class T>
void put(std::span<const double> values, std::span<std::byte> out, const std::string& name) {
  for (std::size_t i = 0; i < values.size(); ++i) {
    if constexpr (std::is_integral_v<T>) {
      const double v = values[i];
      const bool fits = v >= std::numeric_limits<T>::min() && v <= std::numeric_limits<T>::max() && v == std::floor(v);
      if (!fits) throw Error(Failure::defect, name, fmt::format("{} does not fit its integer type", v));
    }
    const T stored = static_cast<T>(values[i]);
    std::memcpy(out.data() + i * sizeof(T), &stored, sizeof(T));
  }
}

}  // namespace

std::vector<std::size_t> lengths(const ProductFile& product, const std::vector<std::string>& dimensions) {
  std::vector<std::size_t> out;
  for (const auto& name : dimensions) out.push_back(dimension(product, name).length);
  return out;
}

bool has_unlimited(const ProductFile& product, const std::vector<std::string>& dimensions) {
  return std::any_of(dimensions.begin(), dimensions.end(),
                     [&](const std::string& name) { return dimension(product, name).unlimited; });
}

std::size_t bytes_of(Type type) {
  switch (type) {
    case Type::text:
    case Type::int8:
      return 1;
    case Type::int32:
    case Type::float32:
      return 4;
    case Type::float64:
      break;
  }
  return 8;
}

std::vector<std::size_t> small_chunk(const ProductFile& product, const SmallVariable& variable) {
  std::vector<std::size_t> chunk = lengths(product, variable.dimensions);
  if (chunk.empty() || !(variable.deflate || has_unlimited(product, variable.dimensions))) return {};
  for (std::size_t i = 0; i < chunk.size(); ++i)
    if (dimension(product, variable.dimensions[i]).unlimited) chunk[i] = kUnlimitedChunk;
  if (variable.deflate) {
    const std::size_t row = product_of(std::span(chunk).subspan(1)) * bytes_of(variable.type);
    chunk[0] = std::clamp<std::size_t>(kSmallChunkBytes / row, 1, chunk[0]);
  }
  return chunk;
}

void encode(const SmallVariable& variable, std::span<const double> values, std::span<std::byte> out) {
  switch (variable.type) {
    case Type::text:
    case Type::int8:
      return put<std::int8_t>(values, out, variable.name);
    case Type::int32:
      return put<std::int32_t>(values, out, variable.name);
    case Type::float32:
      return put<float>(values, out, variable.name);
    case Type::float64:
      return put<double>(values, out, variable.name);
  }
}

std::size_t product_of(std::span<const std::size_t> lengths) {
  std::size_t out = 1;
  for (const std::size_t n : lengths) out *= n;
  return out;
}

std::vector<std::size_t> grid_of(std::span<const std::size_t> lengths, std::span<const std::size_t> chunk) {
  std::vector<std::size_t> out(lengths.size());
  for (std::size_t i = 0; i < out.size(); ++i) out[i] = (lengths[i] + chunk[i] - 1) / chunk[i];
  return out;
}

std::vector<std::size_t> offset_of(std::size_t index, std::span<const std::size_t> grid,
                                   std::span<const std::size_t> chunk) {
  std::vector<std::size_t> out(grid.size());
  for (std::size_t i = grid.size(); i-- > 0; index /= grid[i]) out[i] = index % grid[i] * chunk[i];
  return out;
}

std::vector<std::size_t> chunk_grid(const ProductFile& product, std::size_t variable) {
  const ChunkedVariable& v = product.chunked.at(variable);
  return grid_of(lengths(product, v.dimensions), v.chunk);
}

void check_layout(const ProductFile& product) {
  for (const Dimension& d : product.dimensions)
    if (d.length == 0) throw Error(Failure::defect, d.name, "a product's dimension has no length");
  for (const SmallVariable& v : product.small) {
    const std::size_t count = product_of(lengths(product, v.dimensions));
    if (v.values.size() != count)
      throw Error(Failure::defect, v.name, fmt::format("{} values for {} places", v.values.size(), count));
    if (v.deflate && v.dimensions.empty()) throw Error(Failure::defect, v.name, "a scalar cannot be deflated");
  }
  for (const ChunkedVariable& v : product.chunked) {
    const bool shaped = !v.dimensions.empty() && v.chunk.size() == v.dimensions.size() &&
                        std::find(v.chunk.begin(), v.chunk.end(), 0U) == v.chunk.end();
    if (!shaped || v.level < 0 || v.level > 9) throw Error(Failure::defect, v.name, "chunks or level make no sense");
    const auto whole = lengths(product, v.dimensions);
    for (std::size_t i = 0; i < whole.size(); ++i)
      if (v.chunk[i] > whole[i] && !dimension(product, v.dimensions[i]).unlimited)
        throw Error(Failure::defect, v.name, fmt::format("a chunk is longer than dimension '{}'", v.dimensions[i]));
  }
}

}  // namespace windrow::cf
