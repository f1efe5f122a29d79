// The digest against published vectors, and the laws of compound keys.
#include <doctest/doctest.h>

#include <cmath>
#include <vector>

#include "windrow/codec/codec.h"

using namespace windrow;

namespace {

/// The buffer of xxHash's own sanity test (tests/sanity_test.c, release 0.8.x; from memory): top byte of a running
/// product, first factor PRIME32 = 2654435761, each next PRIME64 = 11400714785074694797.
std::vector<std::byte> sanity_buffer(std::size_t size) {
  std::vector<std::byte> out(size);
  std::uint64_t generator = 2654435761U;
  for (auto& b : out) {
    b = static_cast<std::byte>(generator >> 56);
    generator *= 11400714785074694797ULL;
  }
  return out;
}

struct Vector {
  std::size_t length;
  const char* hex;
};

}  // namespace

TEST_CASE("digests equal the published XXH3-128 vectors") {
  // xxHash 0.8.x, tests/sanity_test_vectors.h, XXH128 with seed 0 (high half first; from memory). The lengths take
  // each of the algorithm's branches: empty, 1-3, 4-8, 9-16, 17-128, 129-240, over 240.
  const Vector vectors[] = {
      {0, "99aa06d3014798d86001c324468d497f"},   {1, "a6cd5e9392000f6ac44bdff4074eecdb"},
      {6, "082afe0b8162d12a3e7039bdda43cfc6"},   {12, "6e3efd8fc7802b18061a192713f69ad9"},
      {24, "0ce966e4678d37611e7044d28b1b901d"},  {48, "a002ac4e5478227ef942219aed80f67b"},
      {81, "4952f58181ab00425e8bafb9f95fb803"},  {222, "337e09641b948717f1aebd597cec6b3a"},
      {403, "1b6de21e332dd73dcdeb804d65c6dea4"},
  };
  for (const auto& v : vectors) {
    CAPTURE(v.length);
    const auto buffer = sanity_buffer(v.length);
    CHECK(codec::digest(buffer).hex() == v.hex);
    CHECK(codec::Hasher().add(std::span<const std::byte>(buffer)).finish().hex() == v.hex);
  }
}

TEST_CASE("a digest survives its text form, and malformed text is the zero digest") {
  const auto d = codec::digest(std::string("mesh"));
  CHECK(codec::Digest::from_hex(d.hex()) == d);
  CHECK(codec::Digest::from_hex("12") == codec::Digest{});
  CHECK(codec::Digest::from_hex("zz" + d.hex().substr(2)) == codec::Digest{});
}

TEST_CASE("a compound key keeps its parts apart") {
  using codec::Hasher;
  CHECK(Hasher().add(std::string("ab")).add(std::string("c")).finish() !=
        Hasher().add(std::string("a")).add(std::string("bc")).finish());
  CHECK(Hasher().add(1.0).finish() != Hasher().add(std::nextafter(1.0, 2.0)).finish());
  CHECK(Hasher().add(std::int64_t{1}).finish() != Hasher().add(1.0).finish());
}

TEST_CASE("a digest does not depend on how the bytes were cut") {
  const auto buffer = sanity_buffer(3000);
  const auto whole = codec::digest(buffer);
  for (std::size_t step : {1U, 7U, 64U, 257U, 1024U}) {
    codec::Hasher h;
    for (std::size_t i = 0; i < buffer.size(); i += step)
      h.add(std::span<const std::byte>(buffer).subspan(i, std::min(step, buffer.size() - i)));
    CHECK(h.finish() == whole);
  }
}
