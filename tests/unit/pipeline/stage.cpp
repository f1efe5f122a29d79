// Laws of a stage on an invented source held in memory: values and balance do not depend on how the work is cut.
#include "windrow/pipeline/stage.h"

#include <doctest/doctest.h>
#include <unistd.h>

#include <cmath>
#include <cstdlib>
#include <cstring>
#include <filesystem>
#include <random>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"

using namespace windrow;
using namespace windrow::pipeline;

namespace {

constexpr std::size_t kNy = 11, kNx = 13, kColumns = 20, kSteps = 75;

struct Folder {
  std::string path;
  Folder() {
    char name[] = "/tmp/windrow-stage-XXXXXX";
    path = ::mkdtemp(name);
  }
  ~Folder() { std::filesystem::remove_all(path); }
};

class Memory : public SourceReader {
 public:
  explicit Memory(bool holes) : values(kSteps * kColumns) {
    std::mt19937_64 random(5);
    for (auto& x : values) {
      x = 250 + static_cast<double>(random() % 60000) / 1000;
      if (holes && random() % 5 == 0) x = std::nan("");
    }
  }
  void read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const override {
    for (std::size_t t = t0; t < t1; ++t) {
      for (const auto c : columns) *out++ = values[t * kColumns + c];
    }
  }
  std::vector<double> values;
};

linear_map::LinearMap make_map() {
  std::mt19937_64 random(6);
  linear_map::LinearMap map;
  map.columns = map.value_columns = kColumns;
  map.row_start = {0};
  for (std::size_t row = 0; row < kNy * kNx; ++row) {
    const auto first = static_cast<std::uint32_t>(random() % (kColumns - 2));
    const std::size_t count = random() % 4;  // some cells without any source
    for (std::uint32_t k = 0; k < count && k < 3; ++k) {
      map.column.push_back(first + k);
      map.share.push_back(count == 1 ? 1.0 : 0.9 / static_cast<double>(count));
    }
    map.row_start.push_back(map.column.size());
    map.row_area.push_back(1e-6 * (1 + static_cast<double>(row % 7) / 10));
  }
  map.column_area.assign(kColumns, 1e-4);
  return map;
}

struct Made {
  std::vector<float> values;  // [step][cell]
  TileStats stats;
  std::vector<std::byte> first_chunk;
};

struct Cut {
  plan::Chunk chunk;
  int threads = 1;
  std::int64_t memory = 1 << 30;
};

Made make(const Memory& source, const linear_map::Weights& weights, const Cut& cut, bool fill, std::size_t stop_after = 0) {
  const Folder folder;
  StageInput input;
  input.weights = &weights;
  input.ny = kNy;
  input.nx = kNx;
  input.chunk = cut.chunk;
  input.field.scale = 1;
  input.field.offset = -273.15;
  input.field.has_range = true;
  input.field.low = -20;
  input.field.high = 30;
  input.level = 1;
  for (std::size_t t = 0; t < kSteps; ++t) {
    const auto bins = BinnedSum::bins(310 * 2e-6 * 2, kNy * kNx + 1);
    input.bins.m1.push_back(bins.m1);
    input.bins.m2.push_back(bins.m2);
  }
  if (fill) {
    input.fill.column.assign(kNy * kNx * FillCandidates::kPerRow, linear_map::SourceBlock::kNotHeld);
    for (std::size_t row = 0; row < kNy * kNx; ++row) {
      input.fill.column[row * FillCandidates::kPerRow] = static_cast<std::uint32_t>(row % kColumns);
    }
  }
  input.products = {{codec::digest(std::string("p")), {0, kSteps, true}, false}};
  plan::StageNeeds needs;
  needs.ny = kNy;
  needs.nx = kNx;
  needs.steps = kSteps;
  needs.chunk = cut.chunk;
  needs.products = {{0, kSteps, true}};
  const std::size_t blocks = ((kNy + cut.chunk.y - 1) / cut.chunk.y) * ((kNx + cut.chunk.x - 1) / cut.chunk.x);
  std::vector<std::uint32_t> all(kColumns);
  for (std::uint32_t c = 0; c < kColumns; ++c) all[c] = c;
  needs.block_columns.assign(blocks, all);
  needs.memory = cut.memory;
  needs.threads = cut.threads;
  const auto stage = plan::make_stage(needs, "test");
  Spool spool(folder.path + "/s.spool");
  int finished = 0;
  StageHooks hooks;
  hooks.finish = [&](std::size_t) { ++finished; };
  if (stop_after > 0) {
    std::size_t looks = 0;
    hooks.stop = [&] { return ++looks > stop_after; };
    CHECK_THROWS_AS(run_stage(input, stage, source, nullptr, spool, hooks), Error);
    CHECK(finished == 0);
    CHECK(spool.size() == stop_after);
    hooks.stop = nullptr;
  }
  run_stage(input, stage, source, nullptr, spool, hooks);
  CHECK(finished == 1);
  Made made;
  made.stats = merge_stats(input, 0, spool);
  made.values.resize(kSteps * kNy * kNx);
  const std::size_t across = (kNx + cut.chunk.x - 1) / cut.chunk.x;
  std::vector<std::byte> packed, shuffled(cut.chunk.time * cut.chunk.y * cut.chunk.x * 4), raw(shuffled.size());
  for (std::size_t t = 0; t < kSteps; ++t) {
    for (std::size_t y = 0; y < kNy; ++y) {
      for (std::size_t x = 0; x < kNx; ++x) {
        const auto block = static_cast<std::uint32_t>(y / cut.chunk.y * across + x / cut.chunk.x);
        const auto index = static_cast<std::uint32_t>(t / cut.chunk.time * blocks + block);
        if (x % cut.chunk.x == 0) {
          spool.payload({input.products[0].key, kDataVariable, index}, packed);
          REQUIRE(codec::inflate(packed, shuffled));
          codec::unshuffle(shuffled, 4, raw);
        }
        const std::size_t at = (t % cut.chunk.time * cut.chunk.y + y % cut.chunk.y) * cut.chunk.x + x % cut.chunk.x;
        std::memcpy(&made.values[(t * kNy + y) * kNx + x], raw.data() + at * 4, 4);
      }
    }
  }
  return made;
}

void check_same(const Made& a, const Made& b) {
  CHECK(std::memcmp(a.values.data(), b.values.data(), a.values.size() * sizeof(float)) == 0);
  CHECK(a.stats.flags == b.stats.flags);
  CHECK(a.stats.count == b.stats.count);
  for (std::size_t i = 0; i < kIntegrals; ++i) {
    for (std::size_t t = 0; t < kSteps; ++t) {
      CHECK(a.stats.integral(static_cast<Integral>(i), t) == b.stats.integral(static_cast<Integral>(i), t));
    }
  }
}

}  // namespace

TEST_CASE("values, flags, counts and integrals are the same bits over chunks, threads, memory and interruption") {
  const auto map = make_map();
  const auto weights = linear_map::make_weights(map, {});
  for (const bool holes : {false, true}) {
    const Memory source(holes);
    for (const bool fill : {false, true}) {
      const auto one = make(source, weights, {{kSteps, kNy, kNx}}, fill);
      check_same(one, make(source, weights, {{10, 4, 5}}, fill));
      check_same(one, make(source, weights, {{7, 11, 3}, 2}, fill));
      check_same(one, make(source, weights, {{1, 2, 13}, 2}, fill));
      check_same(one, make(source, weights, {{16, 3, 3}, 1, 2 << 20}, fill));
      check_same(one, make(source, weights, {{10, 4, 5}}, fill, 17));
    }
  }
}

TEST_CASE("tiles agree with a plain double loop; kept and below integrals add up to the source's overlap integral") {
  const auto map = make_map();
  const auto weights = linear_map::make_weights(map, {});
  const Memory source(true);
  const auto made = make(source, weights, {{10, 4, 5}}, false);
  std::uint64_t missing = 0, low = 0, high = 0;
  for (std::size_t t = 0; t < kSteps; ++t) {
    ExactSum integral;
    for (std::size_t row = 0; row < map.rows(); ++row) {
      double sum = 0, present = 0;
      for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
        const double x = source.values[t * kColumns + map.column[k]];
        if (std::isnan(x)) continue;
        sum += map.share[k] * x;
        present += map.share[k];
        integral.add(map.share[k] * x * map.row_area[row]);
      }
      const float stored = made.values[t * map.rows() + row];
      if (present < 0.5 - 1e-9) {
        ++missing;
        CHECK(stored == 9.96920997e36F);
        continue;
      }
      const double u = sum / present - 273.15;
      low += u < -20 ? 1 : 0;
      high += u > 30 ? 1 : 0;
      CHECK(std::fabs(stored - std::fmin(std::fmax(u, -20), 30)) < 4e-6);
    }
    const double found = made.stats.integral(kKept, t) + made.stats.integral(kBelow, t);
    CHECK(std::fabs(found / integral.value() - 1) < 1e-14);
    if (made.stats.integral(kKept, t) != 0) {
      CHECK(std::fabs(made.stats.integral(kStored, t) / made.stats.integral(kKept, t) - 1) < 0.1);
    }
  }
  CHECK(made.stats.count[kMissing] == missing);
  CHECK(made.stats.count[kClampedLow] == low);
  CHECK(made.stats.count[kClampedHigh] == high);
  CHECK(low + high > 0);
}
