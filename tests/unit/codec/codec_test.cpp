// Byte transforms: round trips, agreement with zlib as an independent implementation, and damaged streams.
#include <doctest/doctest.h>
#include <zlib.h>

#include <cmath>
#include <cstring>
#include <memory>
#include <random>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"

using namespace windrow;
using Bytes = std::vector<std::byte>;

namespace {

/// A made-up temperature-like field as float bytes: smooth plus noise, so that it compresses as products do.
Bytes field(std::size_t values, std::uint32_t seed) {
  std::mt19937 random(seed);
  Bytes out(values * sizeof(float));
  for (std::size_t i = 0; i < values; ++i) {
    const float v =
        280.0F + 10.0F * std::sin(static_cast<float>(i) * 0.01F) + static_cast<float>(random() % 100) * 0.01F;
    std::memcpy(out.data() + i * sizeof(float), &v, sizeof v);
  }
  return out;
}

Bytes noise(std::size_t size, std::uint32_t seed) {
  std::mt19937 random(seed);
  Bytes out(size);
  for (auto& b : out) b = static_cast<std::byte>(random() & 0xFF);
  return out;
}

Bytes zlib_inflated(const Bytes& stream, std::size_t size) {
  Bytes out(size);
  uLongf got = static_cast<uLongf>(size);
  const int status = ::uncompress(reinterpret_cast<Bytef*>(out.data()), &got,
                                  reinterpret_cast<const Bytef*>(stream.data()), static_cast<uLong>(stream.size()));
  REQUIRE(status == Z_OK);
  REQUIRE(got == size);
  return out;
}

}  // namespace

TEST_CASE("the same input gives the same bytes wherever in memory the compressor lies") {
  std::mt19937_64 random(17);
  std::vector<std::vector<std::byte>> inputs(200);
  std::vector<std::vector<std::byte>> first(inputs.size());
  for (auto& input : inputs) {  // small steps of a coarse value, as anomalies have them, bytes apart
    std::vector<float> values(3600);
    for (std::size_t i = 0; i < values.size(); ++i) {
      values[i] = static_cast<float>(static_cast<double>(i / 300) + 0.01 * static_cast<double>(random() % 3));
    }
    input.resize(values.size() * sizeof(float));
    codec::shuffle(std::as_bytes(std::span(values)), sizeof(float), input);
  }
  std::vector<std::unique_ptr<codec::Deflater>> kept;  // so that each has a place of its own
  for (int place = 0; place < 30; ++place) {
    kept.push_back(std::make_unique<codec::Deflater>(1));
    for (std::size_t i = 0; i < inputs.size(); ++i) {
      std::vector<std::byte> out;
      kept.back()->compress(inputs[i], out);
      if (place == 0) first[i] = out;
      REQUIRE(out == first[i]);
    }
  }
}

TEST_CASE("shuffle regroups bytes by significance as HDF5's filter documents") {
  // HDF5 Reference Manual, H5Pset_shuffle: "the first byte of each element is placed first ...". Naive oracle.
  for (std::size_t width : {1U, 2U, 3U, 4U, 8U, 16U})
    for (std::size_t count : {0U, 1U, 5U, 15U, 16U, 17U, 31U, 32U, 33U, 100U, 1000U}) {
      CAPTURE(width);
      CAPTURE(count);
      const Bytes in = noise(width * count, static_cast<std::uint32_t>(width * 1000 + count));
      Bytes out(in.size()), back(in.size()), expected(in.size());
      for (std::size_t i = 0; i < in.size(); ++i) expected[(i % width) * count + i / width] = in[i];
      codec::shuffle(in, width, out);
      CHECK(out == expected);
      codec::unshuffle(out, width, back);
      CHECK(back == in);
    }
}

TEST_CASE("shuffle refuses buffers that are no whole number of elements") {
  Bytes in(10), out(10), small(8);
  CHECK_THROWS_AS(codec::shuffle(in, 4, out), Error);
  CHECK_THROWS_AS(codec::unshuffle(in, 2, small), Error);
}

TEST_CASE("what any level deflates, zlib and windrow inflate") {
  for (int level = 1; level <= 9; ++level) {
    codec::Deflater deflater(level);
    std::vector<Bytes> inputs = {Bytes{}, Bytes(1), Bytes(100000), noise(3, 1), noise(70000, 2), noise(1 << 20, 3)};
    inputs.push_back(field(100000, 4));
    Bytes shuffled(inputs.back().size());
    codec::shuffle(inputs.back(), 4, shuffled);
    inputs.push_back(shuffled);
    for (const auto& in : inputs) {
      CAPTURE(level);
      CAPTURE(in.size());
      Bytes stream, out(in.size());
      deflater.compress(in, stream);
      REQUIRE(stream.size() >= 8);
      // RFC 1950 section 2.2: method 8 in the low half byte, header divisible by 31.
      CHECK((std::to_integer<int>(stream[0]) & 15) == 8);
      CHECK((std::to_integer<int>(stream[0]) * 256 + std::to_integer<int>(stream[1])) % 31 == 0);
      CHECK(zlib_inflated(stream, in.size()) == in);
      CHECK(codec::inflate(stream, out));
      CHECK(out == in);
    }
  }
}

TEST_CASE("what zlib deflates, windrow inflates") {
  const Bytes in = field(50000, 5);
  for (int level = 0; level <= 9; ++level) {
    uLongf size = ::compressBound(static_cast<uLong>(in.size()));
    Bytes stream(size), out(in.size());
    REQUIRE(::compress2(reinterpret_cast<Bytef*>(stream.data()), &size, reinterpret_cast<const Bytef*>(in.data()),
                        static_cast<uLong>(in.size()), level) == Z_OK);
    stream.resize(size);
    CHECK(codec::inflate(stream, out));
    CHECK(out == in);
  }
}

TEST_CASE("a deflater's output does not depend on what it compressed before") {
  const Bytes a = field(60000, 6), b = noise(100000, 7);
  for (int level : {1, 2, 6, 9}) {
    Bytes fresh, again;
    codec::Deflater(level).compress(a, fresh);
    codec::Deflater used(level);
    used.compress(b, again);
    used.compress(a, again);
    CHECK(again == fresh);
    used.compress(a, again);
    CHECK(again == fresh);
  }
}

TEST_CASE("levels outside 1..9 are refused") {
  CHECK_THROWS_AS(codec::Deflater(0), Error);
  CHECK_THROWS_AS(codec::Deflater(10), Error);
}

TEST_CASE("a stream damaged at any byte is refused or yields the very same values") {
  const Bytes in = field(700, 8);
  for (int level : {1, 6}) {
    Bytes stream, out(in.size());
    codec::Deflater(level).compress(in, stream);
    for (std::size_t i = 0; i < stream.size(); ++i)
      for (int flip : {0x01, 0x80, 0xFF}) {
        Bytes damaged = stream;
        damaged[i] ^= static_cast<std::byte>(flip);
        if (codec::inflate(damaged, out)) CHECK(out == in);  // e.g. the header's unused level bits
      }
    for (std::size_t length = 0; length < stream.size(); ++length)
      CHECK_FALSE(codec::inflate(std::span<const std::byte>(stream).first(length), out));
  }
}

TEST_CASE("a stream of another size is refused") {
  const Bytes in = field(700, 9);
  Bytes stream;
  codec::Deflater(1).compress(in, stream);
  Bytes small(in.size() - 1), large(in.size() + 1);
  CHECK_FALSE(codec::inflate(stream, small));
  CHECK_FALSE(codec::inflate(stream, large));
}

TEST_CASE("the CRC is the one of RFC 1952 and finds every single damaged byte") {
  // Check value of CRC-32 for the nine digits: 0xCBF43926 (catalogue of parametrised CRC algorithms, from memory).
  const char* digits = "123456789";
  CHECK(codec::crc32(std::as_bytes(std::span(digits, 9))) == 0xCBF43926U);
  const Bytes in = noise(1000, 10);
  CHECK(codec::crc32(in) == ::crc32(0, reinterpret_cast<const Bytef*>(in.data()), static_cast<uInt>(in.size())));
  for (std::size_t i = 0; i < in.size(); ++i) {
    Bytes damaged = in;
    damaged[i] ^= std::byte{0x10};
    CHECK(codec::crc32(damaged) != codec::crc32(in));
  }
}

TEST_CASE("zstd round trips, and damage never crashes") {
  for (const Bytes& in : {Bytes{}, field(5000, 11), noise(5000, 12)}) {
    const Bytes packed = codec::zstd_compress(in);
    Bytes out(in.size());
    CHECK(codec::zstd_expand(packed, out));
    CHECK(out == in);
    Bytes large(in.size() + 1);
    CHECK_FALSE(codec::zstd_expand(packed, large));
    for (std::size_t i = 0; i < packed.size(); ++i) {
      Bytes damaged = packed;
      damaged[i] ^= std::byte{0x5A};
      codec::zstd_expand(damaged, out);  // the frame carries no check sum: values may differ, the caller's CRC tells
    }
    for (std::size_t length = 0; length < packed.size(); ++length)
      CHECK_FALSE(codec::zstd_expand(std::span<const std::byte>(packed).first(length), out));
  }
}
