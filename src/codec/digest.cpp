// The project's one digest: XXH3, 128 bits, seed 0, canonical (big-endian) byte order.
#include <xxhash.h>

#include <bit>
#include <new>

#include "windrow/codec/codec.h"

namespace windrow::codec {
namespace {

Digest canonical(XXH128_hash_t hash) {
  XXH128_canonical_t bytes;
  XXH128_canonicalFromHash(&bytes, hash);
  Digest d;
  for (std::size_t i = 0; i < d.bytes.size(); ++i) d.bytes[i] = bytes.digest[i];
  return d;
}

/// Numbers enter compound keys as eight little-endian bytes, on every kind of processor.
std::array<std::byte, 8> little_endian(std::uint64_t value) {
  std::array<std::byte, 8> out{};
  for (int i = 0; i < 8; ++i) out[i] = static_cast<std::byte>((value >> (8 * i)) & 0xFF);
  return out;
}

int hex_value(char c) {
  if (c >= '0' && c <= '9') return c - '0';
  if (c >= 'a' && c <= 'f') return c - 'a' + 10;
  if (c >= 'A' && c <= 'F') return c - 'A' + 10;
  return -1;
}

XXH3_state_t* as_state(void* state) { return static_cast<XXH3_state_t*>(state); }

}  // namespace

std::string Digest::hex() const {
  static constexpr char kDigits[] = "0123456789abcdef";
  std::string out;
  out.reserve(2 * bytes.size());
  for (const std::uint8_t b : bytes) {
    out += kDigits[b >> 4];
    out += kDigits[b & 15];
  }
  return out;
}

Digest Digest::from_hex(const std::string& text) {
  Digest d;
  if (text.size() != 2 * d.bytes.size()) return {};
  for (std::size_t i = 0; i < d.bytes.size(); ++i) {
    const int high = hex_value(text[2 * i]), low = hex_value(text[2 * i + 1]);
    if (high < 0 || low < 0) return {};
    d.bytes[i] = static_cast<std::uint8_t>(16 * high + low);
  }
  return d;
}

Digest digest(std::span<const std::byte> bytes) { return canonical(XXH3_128bits(bytes.data(), bytes.size())); }

Hasher::Hasher() : state_(XXH3_createState()) {
  if (state_ == nullptr) throw std::bad_alloc();
  XXH3_128bits_reset(as_state(state_));
}

Hasher::~Hasher() { XXH3_freeState(as_state(state_)); }

Hasher& Hasher::add(std::span<const std::byte> bytes) {
  if (!bytes.empty()) XXH3_128bits_update(as_state(state_), bytes.data(), bytes.size());
  return *this;
}

Hasher& Hasher::add(const std::string& text) {
  add(static_cast<std::int64_t>(text.size()));
  return add(std::as_bytes(std::span(text.data(), text.size())));
}

Hasher& Hasher::add(double value) { return add(std::bit_cast<std::int64_t>(value)); }

Hasher& Hasher::add(std::int64_t value) {
  const auto bytes = little_endian(static_cast<std::uint64_t>(value));
  return add(std::span<const std::byte>(bytes));
}

Digest Hasher::finish() const { return canonical(XXH3_128bits_digest(as_state(state_))); }

}  // namespace windrow::codec
