// Laws of the plan: every chunk is made once, batches hold what their units need, the bound keeps to the ceiling.
#include "windrow/plan/units.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <map>
#include <random>

#include "windrow/base/error.h"
#include "windrow/plan/staleness.h"

using namespace windrow::plan;

namespace {

StageNeeds needs_of(bool adjusted, std::mt19937_64& random) {
  StageNeeds needs;
  needs.ny = 1 + random() % 90;
  needs.nx = 1 + random() % 90;
  needs.steps = 30 + random() % 2000;
  needs.anchor_steps = adjusted ? needs.steps : 0;
  needs.run_is_anchor = random() % 2 == 0;
  needs.chunk = automatic_chunk({needs.ny, needs.nx, adjusted, false, false});
  for (std::size_t t = 0; t < needs.steps; t += 365) {
    needs.products.push_back({t, std::min(needs.steps, t + 365), random() % 4 != 0});
  }
  const std::size_t blocks = ((needs.ny + needs.chunk.y - 1) / needs.chunk.y) *
                             ((needs.nx + needs.chunk.x - 1) / needs.chunk.x);
  for (std::size_t b = 0; b < blocks; ++b) {
    std::vector<std::uint32_t> columns;
    for (std::uint32_t c = 0; c < 40; ++c) {
      if (random() % 8 == 0) columns.push_back(c);
    }
    needs.block_columns.push_back(columns);
  }
  needs.resident = 30 << 20;
  needs.memory = needs.resident + (8 << 20) + static_cast<std::int64_t>(random() % (64 << 20));
  needs.threads = 4;
  return needs;
}

}  // namespace

TEST_CASE("every wanted chunk is made exactly once, inside a batch that holds its columns and steps") {
  std::mt19937_64 random(21);
  int made = 0;
  for (int turn = 0; turn < 200; ++turn) {
    const auto needs = needs_of(turn % 2 == 0, random);
    Stage stage;
    try {
      stage = make_stage(needs, "job");
    } catch (const windrow::Error& error) {
      CHECK(error.kind() == windrow::Failure::job);
      continue;
    }
    ++made;
    CHECK(stage.bound <= needs.memory);
    CHECK(stage.threads >= 1);
    CHECK(stage.threads <= 4);
    std::map<std::tuple<std::uint32_t, std::uint32_t, std::uint32_t>, int> seen;
    for (const auto& batch : stage.batches) {
      for (const auto& unit : batch.units) {
        const auto& columns = needs.block_columns[unit.block];
        CHECK(std::includes(batch.columns.begin(), batch.columns.end(), columns.begin(), columns.end()));
        for (const auto& piece : unit.pieces) {
          CHECK(piece.t0 >= batch.t0);
          CHECK(piece.t1 <= batch.t1);
          CHECK(needs.products[piece.product].wanted);
          CHECK(piece.t0 == needs.products[piece.product].t0 + piece.time_chunk * needs.chunk.time);
          ++seen[{piece.product, piece.time_chunk, unit.block}];
        }
      }
    }
    std::size_t expected = 0;
    for (const auto& span : needs.products) {
      if (span.wanted) expected += (span.t1 - span.t0 + needs.chunk.time - 1) / needs.chunk.time;
    }
    CHECK(seen.size() == expected * needs.block_columns.size());
    for (const auto& [key, count] : seen) CHECK(count == 1);
  }
  CHECK(made > 100);
}

TEST_CASE("automatic chunks never depend on the length of the run and lose little to padding") {
  const auto chunk = automatic_chunk({60, 80, true, false, false});
  CHECK(chunk == Chunk{92, 20, 20});
  CHECK(automatic_chunk({180, 360, false, true, false}) == Chunk{12, 45, 45});
  CHECK(automatic_chunk({1, 1, false, false, true}) == Chunk{1, 1, 1});
  for (const int year : {365, 366}) CHECK((year + 91) / 92 == 4);
}

TEST_CASE("memory that is too small is refused with what would do") {
  StageNeeds needs;
  needs.ny = needs.nx = 100;
  needs.steps = 1000;
  needs.chunk = {92, 50, 50};
  needs.products = {{0, 1000, true}};
  needs.block_columns.assign(4, {1, 2, 3});
  needs.memory = 64 << 20;
  needs.resident = 63 << 20;
  try {
    make_stage(needs, "job.toml");
    FAIL("no error");
  } catch (const windrow::Error& error) {
    CHECK(std::string(error.what()) == "job.toml: memory = 64 MiB is too little; at least 69 MiB are needed");
  }
  needs.memory = 69 << 20;
  CHECK(make_stage(needs, "job.toml").bound <= needs.memory);
}

TEST_CASE("staleness names the first difference") {
  const auto digest = [](std::uint8_t x) {
    windrow::codec::Digest out;
    out.bytes[0] = x;
    return out;
  };
  const Key old{{{"settings", digest(1)}, {"a.nc", digest(2)}}};
  CHECK(why_stale({true, old}, old).empty());
  CHECK(why_stale({false, std::nullopt}, old) == "not made yet");
  CHECK(why_stale({true, std::nullopt}, old) == "no ledger");
  CHECK(why_stale({true, old}, {{{"settings", digest(9)}, {"a.nc", digest(2)}}}) == "settings changed");
  CHECK(why_stale({true, old}, {{{"settings", digest(1)}, {"a.nc", digest(2)}, {"b.nc", digest(3)}}}) == "b.nc is new");
  CHECK(why_stale({true, old}, {{{"settings", digest(1)}}}) == "a.nc is no longer used");
}
