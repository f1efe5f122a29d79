// Laws of the linear map and its kernel.
#include "windrow/linear_map/kernel.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <numeric>
#include <random>

using namespace windrow::linear_map;

namespace {

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

LinearMap random_map(std::size_t rows, std::size_t columns, std::mt19937_64& random) {
  LinearMap map;
  map.columns = map.value_columns = columns;
  map.row_start = {0};
  for (std::size_t row = 0; row < rows; ++row) {
    const std::size_t count = random() % 5;
    std::uint32_t column = static_cast<std::uint32_t>(random() % (columns - 5));
    for (std::size_t k = 0; k < count; ++k) {
      map.column.push_back(column++);
      map.share.push_back(static_cast<double>(1 + random() % 1000) / 1000.0 / static_cast<double>(count));
    }
    map.row_start.push_back(map.column.size());
    map.row_area.push_back(1e-6 * static_cast<double>(1 + row));
  }
  map.column_area.assign(columns, 1e-3);
  map.provenance = "test map";
  return map;
}

SourceBlock source_of(std::size_t columns, std::size_t steps, const std::vector<double>& values) {
  SourceBlock source;
  std::vector<std::uint32_t> all(columns);
  std::iota(all.begin(), all.end(), 0U);
  source.resize(all, columns, steps);
  source.fill(0, steps, values.data());
  return source;
}

}  // namespace

TEST_CASE("a constant stays constant to 1e-14, whatever is missing elsewhere") {
  std::mt19937_64 random(11);
  const auto map = random_map(200, 40, random);
  const auto weights = make_weights(map, {});
  std::vector<double> values(40 * 19, 287.5637);
  for (std::size_t i = 0; i < values.size(); i += 7) values[i] = kNaN;
  const auto source = source_of(40, 19, values);
  std::vector<double> series(19);
  for (std::size_t row = 0; row < map.rows(); ++row) {
    apply_series(weights, row, source, std::span<double>(series));
    for (double x : series) CHECK((std::isnan(x) || std::fabs(x / 287.5637 - 1) < 1e-14));
  }
}

TEST_CASE("the missing-data path gives the same bits as the plain path on complete rows") {
  std::mt19937_64 random(12);
  const auto map = random_map(300, 60, random);
  const auto weights = make_weights(map, {});
  std::vector<double> plain(60 * kLanes);
  for (auto& x : plain) x = static_cast<double>(random() % 100000) / 317.0 - 50;
  auto holed = plain;
  for (std::size_t lane = 0; lane < kLanes; lane += 2) {
    for (std::size_t c = 0; c < 60; ++c) holed[lane * 60 + c] = kNaN;
  }
  const auto a = source_of(60, kLanes, plain), b = source_of(60, kLanes, holed);
  for (std::size_t row = 0; row < map.rows(); ++row) {
    RowLanes full, part;
    apply_row(weights, row, a, 0, full);
    apply_row(weights, row, b, 0, part);
    double sum = 0, total = 0;
    for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
      sum += map.share[k] * plain[60 + map.column[k]];
      total += map.share[k];
    }
    for (std::size_t lane = 1; lane < kLanes; lane += 2) {
      if (map.row_start[row] == map.row_start[row + 1]) continue;
      CHECK(full.value[lane] == part.value[lane]);
      CHECK(full.cover[lane] == part.cover[lane]);
      CHECK(std::isnan(part.value[lane - 1]));
      CHECK(part.cover[lane - 1] == 0);
    }
    if (map.row_start[row + 1] - map.row_start[row] > 1) CHECK(full.value[1] == sum / total);
  }
}

TEST_CASE("a block that holds some columns gives the values of one that holds all") {
  std::mt19937_64 random(14);
  const auto map = random_map(50, 40, random);
  const auto weights = make_weights(map, {});
  std::vector<double> values(40 * 11);
  for (auto& x : values) x = static_cast<double>(random() % 1000);
  const auto all = source_of(40, 11, values);
  for (std::size_t row = 0; row < map.rows(); ++row) {
    const std::vector<std::uint32_t> needed(map.column.begin() + static_cast<std::ptrdiff_t>(map.row_start[row]),
                                            map.column.begin() + static_cast<std::ptrdiff_t>(map.row_start[row + 1]));
    std::vector<double> few;
    for (std::size_t t = 0; t < 11; ++t) {
      for (const auto c : needed) few.push_back(values[t * 40 + c]);
    }
    SourceBlock part;
    part.resize(needed, 40, 11);
    part.fill(0, 11, few.data());
    std::vector<double> a(11), b(11);
    apply_series(weights, row, all, std::span<double>(a));
    apply_series(weights, row, part, std::span<double>(b));
    for (std::size_t t = 0; t < 11; ++t) CHECK((a[t] == b[t] || (std::isnan(a[t]) && std::isnan(b[t]))));
  }
}

TEST_CASE("missing values are renormalised by the cover: two halves, one missing") {
  LinearMap map;
  map.columns = map.value_columns = 2;
  map.row_start = {0, 2};
  map.column = {0, 1};
  map.share = {0.5, 0.5};
  map.row_area = {1};
  const auto weights = make_weights(map, {});
  const auto source = source_of(2, 2, {10, kNaN, 10, 20});
  RowLanes lanes;
  apply_row(weights, 0, source, 0, lanes);
  CHECK(lanes.value[0] == 10);
  CHECK(lanes.cover[0] == 0.5);
  CHECK(lanes.value[1] == 15);
  CHECK(lanes.cover[1] == 1);
  CHECK(std::isnan(lanes.value[2]));
}

TEST_CASE("a source cell with 5 % land serves its land; without any land the all-surface value stands, flagged") {
  LinearMap map;
  map.columns = map.value_columns = 3;
  map.row_start = {0, 2, 3};
  map.column = {0, 1, 2};
  map.share = {0.5, 0.5, 1.0};
  map.row_area = {1, 1};
  const std::vector<double> land{0.05, 0.0, 0.0};
  const auto weights = make_weights(map, land);
  CHECK(weights.row_fraction[0] == doctest::Approx(0.025));
  CHECK(weights.all_surface[0] == 0);
  CHECK(weights.all_surface[1] == 1);
  const auto source = source_of(3, 1, {10, 20, 30});
  RowLanes lanes;
  apply_row(weights, 0, source, 0, lanes);
  CHECK(lanes.value[0] == doctest::Approx(10).epsilon(1e-15));
  CHECK(lanes.cover[0] == 1);
  apply_row(weights, 1, source, 0, lanes);
  CHECK(lanes.value[0] == 30);
}

TEST_CASE("totals are split by the share of the source cell and never renormalised") {
  LinearMap map;
  map.quantity = Quantity::total;
  map.columns = map.value_columns = 1;
  map.row_start = {0, 1, 2};
  map.column = {0, 0};
  map.share = {0.25, 0.75};
  map.row_area = {1, 3};
  map.column_area = {4};
  const auto weights = make_weights(map, {});
  const auto source = source_of(1, 1, {100});
  RowLanes a, b;
  apply_row(weights, 0, source, 0, a);
  apply_row(weights, 1, source, 0, b);
  CHECK(a.value[0] == 25);
  CHECK(a.cover[0] == 1);
  CHECK(b.value[0] == 75);
  CHECK(column_overlap(map)[0] == doctest::Approx(4).epsilon(1e-15));
}

TEST_CASE("a map survives the workspace; damage at any byte is noticed") {
  std::mt19937_64 random(13);
  const auto map = random_map(20, 30, random);
  auto bytes = serialise(map);
  LinearMap back;
  REQUIRE(parse(bytes, back));
  CHECK(back == map);
  for (std::size_t i = 0; i < bytes.size(); ++i) {
    bytes[i] ^= std::byte{0x40};
    LinearMap damaged;
    CHECK_FALSE(parse(bytes, damaged));
    bytes[i] ^= std::byte{0x40};
  }
  for (std::size_t length = 0; length < bytes.size(); length += 13) {
    LinearMap cut;
    CHECK_FALSE(parse(std::span(bytes).first(length), cut));
  }
}
