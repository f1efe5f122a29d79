// Byte transforms of finished tiles and the project's one digest. No file knowledge.
#pragma once
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "windrow/codec/digest.h"

namespace windrow::codec {

std::string library_version();  ///< "libdeflate 1.14, zstd 1.5.4, xxHash 0.8.1"

/// HDF5 shuffle filter: bytes regrouped by significance. out.size() == in.size(), a multiple of `width`.
void shuffle(std::span<const std::byte> in, std::size_t width, std::span<std::byte> out);
void unshuffle(std::span<const std::byte> in, std::size_t width, std::span<std::byte> out);

/// zlib stream (RFC 1950) that any inflater reads. Level 1..9 of libdeflate. Same bytes for same input on one
/// kind of processor. `out` is resized to the stream. level 0 is not accepted (callers store raw).
class Deflater {
 public:
  explicit Deflater(int level);
  ~Deflater();
  Deflater(const Deflater&) = delete;
  Deflater& operator=(const Deflater&) = delete;
  void compress(std::span<const std::byte> in, std::vector<std::byte>& out);

 private:
  struct State;
  State* state_;
};

/// Inflates a zlib stream whose size is known; false when the stream is damaged or of another size.
bool inflate(std::span<const std::byte> in, std::span<std::byte> out);

Digest digest(std::span<const std::byte> bytes);
inline Digest digest(const std::string& text) { return digest(std::as_bytes(std::span(text.data(), text.size()))); }

/// Streaming form for files and compound keys.
class Hasher {
 public:
  Hasher();
  ~Hasher();
  Hasher(const Hasher&) = delete;
  Hasher& operator=(const Hasher&) = delete;
  Hasher& add(std::span<const std::byte> bytes);
  Hasher& add(const std::string& text);  ///< length-prefixed, so that "ab","c" differs from "a","bc"
  Hasher& add(double value);
  Hasher& add(std::int64_t value);
  [[nodiscard]] Digest finish() const;

 private:
  void* state_;
};

std::uint32_t crc32(std::span<const std::byte> bytes);
std::vector<std::byte> zstd_compress(std::span<const std::byte> in, int level = 1);
bool zstd_expand(std::span<const std::byte> in, std::span<std::byte> out);  ///< false when damaged or of another size

}  // namespace windrow::codec
