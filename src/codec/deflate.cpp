// Deflate and inflate as zlib streams (RFC 1950) with libdeflate. Also the spool's CRC and the workspace's zstd. No
// file knowledge.
#include <libdeflate.h>
#include <zstd.h>

#include <algorithm>
#include <limits>
#include <memory>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"

namespace windrow::codec {
namespace {

struct FreeCompressor {
  void operator()(libdeflate_compressor* c) const { libdeflate_free_compressor(c); }
};
struct FreeDecompressor {
  void operator()(libdeflate_decompressor* d) const { libdeflate_free_decompressor(d); }
};
struct FreeZstd {
  void operator()(ZSTD_CCtx* c) const { ZSTD_freeCCtx(c); }
  void operator()(ZSTD_DCtx* d) const { ZSTD_freeDCtx(d); }
};

}  // namespace

struct Deflater::State {
  std::unique_ptr<libdeflate_compressor, FreeCompressor> compressor;
};

Deflater::Deflater(int level) {
  if (level < 1 || level > 9) throw Error(Failure::defect, "deflate", "level must be 1..9");
  auto state = std::make_unique<State>();
  state->compressor.reset(libdeflate_alloc_compressor(level));
  if (!state->compressor) throw std::bad_alloc();
  state_ = state.release();
}

Deflater::~Deflater() { delete state_; }

void Deflater::compress(std::span<const std::byte> in, std::vector<std::byte>& out) {
  if (in.size() > std::numeric_limits<std::uint32_t>::max() / 2)
    throw Error(Failure::defect, "deflate", "a tile over 2 GiB cannot be compressed in one piece");
  libdeflate_compressor* compressor = state_->compressor.get();
  out.resize(libdeflate_zlib_compress_bound(compressor, in.size()));
  const std::size_t size = libdeflate_zlib_compress(compressor, in.data(), in.size(), out.data(), out.size());
  if (size == 0) throw Error(Failure::defect, "deflate", "the compressor refused a tile");
  out.resize(size);
}

bool inflate(std::span<const std::byte> in, std::span<std::byte> out) {
  thread_local std::unique_ptr<libdeflate_decompressor, FreeDecompressor> own(libdeflate_alloc_decompressor());
  if (!own) throw std::bad_alloc();
  // Without a place for the actual size, libdeflate reports anything but an exact fit as a failure.
  return libdeflate_zlib_decompress(own.get(), in.data(), in.size(), out.data(), out.size(), nullptr) ==
         LIBDEFLATE_SUCCESS;
}

std::uint32_t crc32(std::span<const std::byte> bytes) { return libdeflate_crc32(0, bytes.data(), bytes.size()); }

std::vector<std::byte> zstd_compress(std::span<const std::byte> in, int level) {
  thread_local std::unique_ptr<ZSTD_CCtx, FreeZstd> own(ZSTD_createCCtx());
  if (!own) throw std::bad_alloc();
  std::vector<std::byte> out(ZSTD_compressBound(in.size()));
  const std::size_t size = ZSTD_compressCCtx(own.get(), out.data(), out.size(), in.data(), in.size(), level);
  if (ZSTD_isError(size)) throw Error(Failure::defect, "zstd", ZSTD_getErrorName(size));
  out.resize(size);
  return out;
}

bool zstd_expand(std::span<const std::byte> in, std::span<std::byte> out) {
  if (in.empty()) return false;  // no frame at all, which zstd takes for an expansion to nothing
  thread_local std::unique_ptr<ZSTD_DCtx, FreeZstd> own(ZSTD_createDCtx());
  if (!own) throw std::bad_alloc();
  const std::size_t size = ZSTD_decompressDCtx(own.get(), out.data(), out.size(), in.data(), in.size());
  return !ZSTD_isError(size) && size == out.size();
}

}  // namespace windrow::codec
