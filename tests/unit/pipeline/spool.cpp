// Laws of the spool: what was appended is there after a restart, and damage costs only what stands behind it.
#include "windrow/pipeline/spool.h"

#include <doctest/doctest.h>
#include <unistd.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>

#include "windrow/codec/codec.h"
#include "windrow/pipeline/tile_stats.h"

using namespace windrow;
using pipeline::Spool;
using pipeline::TileId;

namespace {

struct Folder {
  std::string path;
  Folder() {
    char name[] = "/tmp/windrow-spool-XXXXXX";
    path = ::mkdtemp(name);
  }
  ~Folder() { std::filesystem::remove_all(path); }
};

std::vector<std::byte> bytes(std::size_t count, int seed) {
  std::vector<std::byte> out(count);
  for (std::size_t i = 0; i < count; ++i) out[i] = static_cast<std::byte>((i * 7 + static_cast<std::size_t>(seed)) % 251);
  return out;
}

TileId id(std::uint32_t chunk) { return {codec::digest(std::string("product")), 0, chunk}; }

}  // namespace

TEST_CASE("tiles are found again after a restart, and a tile appended twice is kept once") {
  const Folder folder;
  const std::string path = folder.path + "/a.spool";
  {
    Spool spool(path);
    for (std::uint32_t k = 0; k < 5; ++k) spool.append(id(k), {}, bytes(100 + k, 1), bytes(k, 2));
    spool.append(id(3), {}, bytes(9, 9), bytes(9, 9));
  }
  const Spool again(path);
  CHECK(again.size() == 5);
  std::vector<std::byte> out;
  again.payload(id(3), out);
  CHECK(out == bytes(103, 1));
  again.aux(id(3), out);
  CHECK(out == bytes(3, 2));
  CHECK_FALSE(again.has(id(5)));
}

TEST_CASE("a spool cut or damaged at any byte keeps every record before it and goes on") {
  const Folder folder;
  const std::string path = folder.path + "/a.spool";
  std::vector<std::uint64_t> ends{0};
  {
    Spool spool(path);
    for (std::uint32_t k = 0; k < 3; ++k) {
      spool.append(id(k), {}, bytes(40, static_cast<int>(k)), bytes(5, 2));
      ends.push_back(std::filesystem::file_size(path));
    }
  }
  std::ifstream file(path, std::ios::binary);
  const std::string whole((std::istreambuf_iterator<char>(file)), {});
  for (std::size_t at = 0; at < whole.size(); ++at) {
    std::size_t intact = 0;
    while (ends[intact + 1] <= at) ++intact;
    for (const bool cut : {true, false}) {
      std::string text = cut ? whole.substr(0, at) : whole;
      if (!cut) text[at] = static_cast<char>(text[at] ^ 0x10);
      std::ofstream(path, std::ios::binary | std::ios::trunc) << text;
      Spool spool(path);
      CHECK(spool.size() == intact);
      spool.append(id(7), {}, bytes(11, 7), {});
      CHECK(Spool(path).has(id(7)));
    }
  }
}

TEST_CASE("a spool of other products is emptied, one that holds a wanted tile is kept whole") {
  const Folder folder;
  const std::string path = folder.path + "/a.spool";
  Spool spool(path);
  spool.append(id(1), {}, bytes(20, 1), {});
  spool.keep_for({codec::digest(std::string("other")), id(1).product});
  CHECK(spool.has(id(1)));
  spool.keep_for({codec::digest(std::string("other"))});
  CHECK(spool.size() == 0);
  CHECK(std::filesystem::file_size(path) == 0);
  spool.append(id(2), {}, bytes(20, 2), {});
  CHECK(Spool(path).has(id(2)));
}

TEST_CASE("statistics of a tile survive the spool; cut ones are noticed") {
  pipeline::TileStats stats;
  stats.resize(3, 6);
  stats.high[pipeline::kKept] = {1.5, -2, 3};
  stats.low[pipeline::kBelow] = {0, 1e-18, 0};
  stats.count[pipeline::kMissing] = 42;
  stats.flags = {0, 1, 2, 4, 8, 16};
  stats.minimum = -3;
  const auto packed = serialise(stats);
  pipeline::TileStats back;
  REQUIRE(parse(packed, back));
  CHECK(back.high == stats.high);
  CHECK(back.low == stats.low);
  CHECK(back.count == stats.count);
  CHECK(back.flags == stats.flags);
  CHECK(back.minimum == stats.minimum);
  for (std::size_t length = 0; length < packed.size(); ++length) {
    CHECK_FALSE(parse(std::span(packed).first(length), back));
  }
}
