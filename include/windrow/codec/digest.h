// The 128-bit content digest as a plain value, so that other modules can carry it without the codecs.
#pragma once
#include <array>
#include <compare>
#include <cstdint>
#include <string>

namespace windrow::codec {

/// XXH3 with seed 0, 128 bits, canonical byte order.
struct Digest {
  std::array<std::uint8_t, 16> bytes{};
  auto operator<=>(const Digest&) const = default;
  [[nodiscard]] std::string hex() const;
  static Digest from_hex(const std::string& text);  ///< zero digest when malformed
};

}  // namespace windrow::codec
