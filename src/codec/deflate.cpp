// Deflate and inflate as zlib streams (RFC 1950): ISA-L at level 1, libdeflate above and for inflating.
// Also the spool's CRC and the workspace's zstd. No file knowledge.
#include <isa-l/crc.h>
#include <isa-l/igzip_lib.h>
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

/// Room that ISA-L's level 1 hardly ever exceeds: stored blocks cost 5 bytes each, header and check sum 6. When it
/// does, the loop in compress_isal asks again with more.
std::size_t first_room(std::size_t size) { return size + size / 1024 + 512; }

}  // namespace

struct Deflater::State {
  int level = 1;
  std::unique_ptr<libdeflate_compressor, FreeCompressor> higher;  ///< levels 2..9
  isal_zstream stream{};                                          ///< level 1
  std::vector<std::uint8_t> work;                                 ///< ISA-L's hash table and symbols

  void compress_isal(std::span<const std::byte> in, std::vector<std::byte>& out);
};

void Deflater::State::compress_isal(std::span<const std::byte> in, std::vector<std::byte>& out) {
  isal_deflate_init(&stream);
  stream.level = 1;
  stream.level_buf = work.data();
  stream.level_buf_size = static_cast<std::uint32_t>(work.size());
  stream.gzip_flag = IGZIP_ZLIB;
  stream.flush = NO_FLUSH;
  stream.end_of_stream = 1;
  stream.next_in = reinterpret_cast<std::uint8_t*>(const_cast<std::byte*>(in.data()));
  stream.avail_in = static_cast<std::uint32_t>(in.size());
  out.resize(first_room(in.size()));
  std::size_t written = 0;
  while (true) {
    stream.next_out = reinterpret_cast<std::uint8_t*>(out.data() + written);
    stream.avail_out = static_cast<std::uint32_t>(out.size() - written);
    if (isal_deflate(&stream) != COMP_OK) throw Error(Failure::defect, "deflate", "the compressor refused a tile");
    written = out.size() - stream.avail_out;
    if (stream.internal_state.state == ZSTATE_END) break;
    out.resize(out.size() + out.size() / 4 + 4096);
  }
  out.resize(written);
}

Deflater::Deflater(int level) {
  if (level < 1 || level > 9) throw Error(Failure::defect, "deflate", "level must be 1..9");
  auto state = std::make_unique<State>();
  state->level = level;
  if (level == 1) {
    state->work.resize(ISAL_DEF_LVL1_DEFAULT);
  } else {
    state->higher.reset(libdeflate_alloc_compressor(level));
    if (!state->higher) throw std::bad_alloc();
  }
  state_ = state.release();
}

Deflater::~Deflater() { delete state_; }

void Deflater::compress(std::span<const std::byte> in, std::vector<std::byte>& out) {
  if (in.size() > std::numeric_limits<std::uint32_t>::max() / 2)
    throw Error(Failure::defect, "deflate", "a tile over 2 GiB cannot be compressed in one piece");
  if (state_->level == 1) return state_->compress_isal(in, out);
  out.resize(libdeflate_zlib_compress_bound(state_->higher.get(), in.size()));
  const std::size_t size = libdeflate_zlib_compress(state_->higher.get(), in.data(), in.size(), out.data(), out.size());
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

std::uint32_t crc32(std::span<const std::byte> bytes) {
  return crc32_gzip_refl(0, reinterpret_cast<const unsigned char*>(bytes.data()), bytes.size());
}

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
