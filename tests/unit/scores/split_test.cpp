// Laws of what is left out: single stations, blocks, years.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <random>

#include "windrow/base/error.h"
#include "windrow/scores/split.h"

using namespace windrow;
using namespace windrow::scores;

namespace {

using Places = std::vector<double>;  // stations on a line, metres

Distance along(const Places& places) {
  return [places](std::size_t i, std::size_t j) { return std::fabs(places[i] - places[j]); };
}

GeoPoint at(double longitude, double latitude) { return {Angle::degrees(longitude), Angle::degrees(latitude)}; }

std::vector<GeoPoint> scattered(std::size_t n, std::uint64_t seed, double west, double width) {
  std::mt19937_64 random(seed);
  std::uniform_real_distribution<double> unit(0, 1);
  std::vector<GeoPoint> out;
  for (std::size_t i = 0; i < n; ++i) {
    double longitude = west + width * unit(random);
    if (longitude > 180) longitude -= 360;
    out.push_back(at(longitude, 40 + 5 * unit(random)));
  }
  return out;
}

}  // namespace

TEST_CASE("a station left out takes those within 2 km with it, and only those") {
  const auto splits = leave_one_out(5, along({0, 1999, 2000, 2001, 9000}));
  REQUIRE(splits.size() == 5);
  CHECK(splits[0].scored == std::vector<std::size_t>{0});
  CHECK(splits[0].fitted == std::vector<std::size_t>{3, 4});  // exactly 2 km is too near
  CHECK(splits[2].fitted == std::vector<std::size_t>{4});
  CHECK(splits[4].fitted == std::vector<std::size_t>{0, 1, 2, 3});
  CHECK(leave_one_out(0, along({})).empty());
  CHECK(leave_one_out(1, along({5}))[0].fitted.empty());
}

TEST_CASE("each station is scored once, and never fitted where it or a neighbour within 2 km is scored") {
  std::mt19937_64 random(2000);
  Places places(60);
  std::vector<int> block(60);
  for (double& place : places) place = static_cast<double>(random() % 40000);
  for (int& b : block) b = static_cast<int>(random() % 7) * 3;
  const Distance distance = along(places);
  const auto splits = leave_blocks_out(block, distance);
  std::vector<int> scored(60, 0);
  for (const StationSplit& split : splits) {
    for (const std::size_t i : split.scored) ++scored[i];
    for (std::size_t i = 0; i < 60; ++i) {
      const bool fitted = std::find(split.fitted.begin(), split.fitted.end(), i) != split.fitted.end();
      double nearest = 1e9;
      for (const std::size_t j : split.scored) nearest = std::min(nearest, distance(i, j));
      CHECK(fitted == (nearest > 2000 && block[i] != block[split.scored[0]]));
    }
  }
  CHECK(std::all_of(scored.begin(), scored.end(), [](int n) { return n == 1; }));
  CHECK_THROWS_AS((void)leave_blocks_out({0, -1}, along({0, 1})), Error);
}

TEST_CASE("eight stations fall into the four blocks worked by hand") {
  // Two rows of four, wide apart in longitude: halved across the meridian 1.5, then each half across its own.
  std::vector<GeoPoint> stations;
  for (int row = 0; row < 2; ++row) {
    for (int column = 0; column < 4; ++column) stations.push_back(at(column, 0.1 * row));
  }
  CHECK(spatial_blocks(stations, 4) == std::vector<int>{0, 1, 2, 3, 0, 1, 2, 3});
  CHECK(spatial_blocks(stations, 2) == std::vector<int>{0, 0, 1, 1, 0, 0, 1, 1});
  CHECK(spatial_blocks(stations, 1) == std::vector<int>(8, 0));
  // At 70 N three degrees of longitude are shorter than two of latitude.
  const std::vector<GeoPoint> north = {at(0, 69), at(3, 69), at(0, 71), at(3, 71)};
  CHECK(spatial_blocks(north, 2) == std::vector<int>{0, 0, 1, 1});
  CHECK(spatial_blocks({}, 3).empty());
  CHECK_THROWS_AS((void)spatial_blocks(stations, 0), Error);
}

TEST_CASE("numbers of stations differ by at most one between blocks") {
  std::size_t widest = 0;
  for (std::size_t n = 1; n <= 120; ++n) {
    const auto stations = scattered(n, n, -5, 12);
    for (int blocks = 1; blocks <= 16; ++blocks) {
      std::vector<std::size_t> count(static_cast<std::size_t>(blocks), 0);
      for (const int b : spatial_blocks(stations, blocks)) ++count.at(static_cast<std::size_t>(b));
      const auto [least, most] = std::minmax_element(count.begin(), count.end());
      widest = std::max(widest, *most - *least);
    }
  }
  CHECK(widest == 1);
}

TEST_CASE("the date line and the order of the stations make no difference to the blocks") {
  const auto home = scattered(50, 9, 10, 12), away = scattered(50, 9, 174, 12);  // the second crosses 180 degrees
  const std::vector<int> blocks = spatial_blocks(home, 5);
  CHECK(spatial_blocks(away, 5) == blocks);
  std::vector<std::size_t> order(50);
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::mt19937_64 random(12);
  std::shuffle(order.begin(), order.end(), random);
  std::vector<GeoPoint> shuffled;
  for (const std::size_t i : order) shuffled.push_back(home[i]);
  const std::vector<int> again = spatial_blocks(shuffled, 5);
  for (std::size_t k = 0; k < order.size(); ++k) CHECK(again[k] == blocks[order[k]]);
}

TEST_CASE("split periods fit one part of the years and score the other, both ways") {
  const std::vector<int> years = {1995, 1991, 1992, 1994, 1993};
  const auto odd = odd_and_even(years);
  REQUIRE(odd.size() == 2);
  CHECK(odd[0].fitted == std::vector<int>{1991, 1993, 1995});
  CHECK(odd[0].scored == std::vector<int>{1992, 1994});
  CHECK(odd[1].fitted == odd[0].scored);
  CHECK(odd[1].scored == odd[0].fitted);
  const auto half = halves(years);
  CHECK(half[0].fitted == std::vector<int>{1991, 1992});
  CHECK(half[0].scored == std::vector<int>{1993, 1994, 1995});
  CHECK(half[1].fitted == half[0].scored);
  CHECK(odd_and_even(std::vector<int>{-1, 0})[0].fitted == std::vector<int>{-1});  // year -1 is odd
  CHECK(halves({})[0].fitted.empty());
}
