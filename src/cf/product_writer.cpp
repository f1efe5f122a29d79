// Writing a product whole: defined with netCDF, closed, then its chunks by direct write in ascending order.
#include <fmt/format.h>

#include <filesystem>

#include "hdf5_chunks.h"
#include "product_define.h"
#include "product_layout.h"
#include "windrow/base/error.h"
#include "windrow/cf/product.h"
#include "windrow/codec/codec.h"

namespace windrow::cf {
namespace {

/// Removes the file unless the writing was completed.
class Partial {
 public:
  explicit Partial(const std::string& path) : path_(path) {}
  ~Partial() {
    std::error_code ignored;
    if (!complete_) std::filesystem::remove(path_, ignored);
  }
  Partial(const Partial&) = delete;
  Partial& operator=(const Partial&) = delete;
  void complete() { complete_ = true; }

 private:
  std::string path_;
  bool complete_ = false;
};

/// Large variables given whole go the chunks' fast way too: the library's deflate is an order of magnitude slower.
void write_small(ChunkFile& file, const ProductFile& product, const SmallVariable& v) {
  const auto whole = lengths(product, v.dimensions), chunk = small_chunk(product, v), grid = grid_of(whole, chunk);
  const std::size_t row = product_of(whole) / whole[0], width = bytes_of(v.type);
  std::vector<std::byte> plain(product_of(chunk) * width), shuffled(plain.size()), packed;
  codec::Deflater deflater(1);
  file.begin(v.name, whole, true);
  for (std::size_t index = 0; index < grid[0]; ++index) {
    const std::size_t first = index * chunk[0], rows = std::min(chunk[0], whole[0] - first);
    std::fill(plain.begin(), plain.end(), std::byte{0});
    encode(v, std::span(v.values).subspan(first * row, rows * row), plain);
    codec::shuffle(plain, width, shuffled);
    deflater.compress(shuffled, packed);
    file.write(offset_of(index, grid, chunk), packed);
  }
  file.end();
}

void write_chunks(ChunkFile& file, const ProductFile& product, std::size_t variable, const ChunkSource& chunks) {
  const ChunkedVariable& v = product.chunked[variable];
  const auto grid = chunk_grid(product, variable);
  const std::size_t count = product_of(grid), raw_bytes = product_of(v.chunk) * sizeof(float);
  file.begin(v.name, lengths(product, v.dimensions), v.level > 0);
  for (std::size_t index = 0; index < count; ++index) {
    const std::span<const std::byte> bytes = chunks(variable, index);
    if (bytes.empty() || (v.level == 0 && bytes.size() != raw_bytes))
      throw Error(Failure::defect, v.name, fmt::format("chunk {} has {} bytes", index, bytes.size()));
    file.write(offset_of(index, grid, v.chunk), bytes);
  }
  file.end();
}

}  // namespace

void write_product(const std::string& path, const ProductFile& product, const ChunkSource& chunks) {
  check_layout(product);
  Partial partial(path);
  define_product(path, product);
  ChunkFile file(path);
  for (const SmallVariable& v : product.small)
    if (v.deflate) write_small(file, product, v);
  for (std::size_t i = 0; i < product.chunked.size(); ++i) write_chunks(file, product, i, chunks);
  file.close();
  partial.complete();
}

}  // namespace windrow::cf
