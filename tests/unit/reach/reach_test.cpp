// Laws of the reach: shares, tapers, fades, no seams.
#include "windrow/reach/reach.h"

#include <doctest/doctest.h>
#include <omp.h>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <random>

#include "points.h"

namespace windrow::reach {
TEST_CASE("inverse distance gives the estimates of Isaaks & Srivastava 1989, chapter 12") {
  // Seven samples of the Walker Lake set about the point (65, 137); inputs from memory, the results recomputed
  // independently: 593.954, 597.620, 635.375 and 672.993 for the powers 1, 2, 5 and 10.
  const double x[] = {61, 63, 64, 68, 71, 73, 75};
  const double y[] = {139, 140, 129, 128, 140, 141, 128};
  const double v[] = {477, 696, 227, 646, 606, 791, 783};
  const double power[] = {1, 2, 5, 10};
  const double expected[] = {593.954, 597.620, 635.375, 672.993};
  for (int k = 0; k < 4; ++k) {
    double sum = 0, total = 0;
    for (int i = 0; i < 7; ++i) {
      const double w = shepard_weight(std::hypot(x[i] - 65, y[i] - 137), power[k]);
      sum += w * v[i];
      total += w;
    }
    CHECK(std::abs(sum / total - expected[k]) < 0.0005);
  }
}

TEST_CASE("great-circle distances are those of the sphere") {
  constexpr double kQuarter = 6371007.1809 * std::numbers::pi / 2;
  CHECK(distance_m(at(0, 0), at(90, 0)) == doctest::Approx(kQuarter).epsilon(1e-14));
  CHECK(distance_m(at(12, 90), at(-70, 0)) == doctest::Approx(kQuarter).epsilon(1e-14));
  CHECK(distance_m(at(0, 0), at(180, 0)) == doctest::Approx(2 * kQuarter).epsilon(1e-14));
  CHECK(distance_m(at(179.5, 0), at(-179.5, 0)) == doctest::Approx(kQuarter / 90).epsilon(1e-12));
  CHECK(distance_m(at(10, 45), at(10, 45)) == 0);
}

TEST_CASE("shares are non-negative, ascending in station and sum to 1") {
  for (const int count : {1, 7, 600}) {
    const auto stations = random_points(count, 6, 11);
    const auto cells = random_points(2000, 8, 12);
    Options options;
    options.radius_m = 120e3;
    for (const Method method : {Method::nearest, Method::inverse_distance}) {
      options.method = method;
      const ReachMap reach = make_reach(stations, cells, options);
      REQUIRE(reach.map.rows() == cells.size());
      REQUIRE(reach.fade.size() == cells.size());
      CHECK(reach.map.columns == stations.size());
      double worst = 0;
      bool ordered = true, consistent = true;
      std::size_t most = 0;
      for (std::size_t i = 0; i < cells.size(); ++i) {
        const auto from = reach.map.row_start[i], to = reach.map.row_start[i + 1];
        double nearest = 1e30;
        for (const auto& s : stations) nearest = std::min(nearest, distance_m(s, cells[i]));
        consistent = consistent && (to > from) == (nearest < options.radius_m);
        consistent = consistent && (nearest > options.radius_m / 2 || reach.fade[i] == 1);
        consistent = consistent && (nearest < options.radius_m || reach.fade[i] == 0);
        most = std::max(most, static_cast<std::size_t>(to - from));
        if (from == to) continue;
        double sum = 0;
        for (auto p = from; p < to; ++p) {
          ordered = ordered && reach.map.share[p] > 0 && (p == from || reach.map.column[p - 1] < reach.map.column[p]);
          sum += reach.map.share[p];
        }
        worst = std::max(worst, std::abs(sum - 1));
      }
      CHECK(worst < 1e-14);
      CHECK(ordered);
      CHECK(consistent);
      CHECK(most <= (method == Method::nearest ? 1u : count == 600 ? 32u : static_cast<unsigned>(count)));
    }
  }
}

TEST_CASE("near stations the ratio of shares is the plain Shepard ratio") {
  const std::vector<GeoPoint> stations = {at(10, 45), at(10.01, 45)};
  const std::vector<GeoPoint> cell = {at(10.002, 45)};
  for (const double power : {1.0, 2.0, 3.5}) {
    Options options;
    options.power = power;
    const ReachMap reach = make_reach(stations, cell, options);
    REQUIRE(reach.map.pairings() == 2);
    CHECK(reach.map.share[0] / reach.map.share[1] == doctest::Approx(std::pow(4.0, power)).epsilon(2e-5));
  }
}

TEST_CASE("a station at the point takes all, co-located stations share, ties of the nearest go to the lower number") {
  const std::vector<GeoPoint> stations = {at(10, 45), at(11, 45), at(11, 45), at(12, 45)};
  const std::vector<GeoPoint> cells = {at(10, 45), at(11, 45), at(11 + 5e-6, 45)};
  const ReachMap reach = make_reach(stations, cells, {});
  CHECK(reach.map.row_start == std::vector<std::uint64_t>{0, 1, 3, 5});
  CHECK(reach.map.column == std::vector<std::uint32_t>{0, 1, 2, 1, 2});
  CHECK(reach.map.share == std::vector<double>{1, 0.5, 0.5, 0.5, 0.5});
  Options nearest;
  nearest.method = Method::nearest;
  CHECK(make_reach(stations, cells, nearest).map.column == std::vector<std::uint32_t>{0, 1, 1});
}

TEST_CASE("cells beyond the radius have an empty row and no fade") {
  const ReachMap reach = make_reach({at(10, 45)}, {at(20, 45)}, {});
  CHECK(reach.map.pairings() == 0);
  CHECK(reach.fade[0] == 0);
  const ReachMap none = make_reach({}, {at(20, 45)}, {});
  CHECK(none.map.rows() == 1);
  CHECK(none.fade[0] == 0);
}

TEST_CASE("the fade falls smoothly from 1 at half the radius to 0 at the radius") {
  std::vector<GeoPoint> cells;
  for (int i = 0; i <= 4000; ++i) cells.push_back(at(10, 45 + i * 1e-3));
  Options options;
  options.radius_m = 300e3;
  const ReachMap reach = make_reach({at(10, 45)}, cells, options);
  double steepest = 0, sharpest = 0;
  for (std::size_t i = 2; i < cells.size(); ++i) {
    CHECK_MESSAGE(reach.fade[i] <= reach.fade[i - 1], i);
    steepest = std::max(steepest, reach.fade[i - 1] - reach.fade[i]);
    sharpest = std::max(sharpest, std::abs(reach.fade[i] - 2 * reach.fade[i - 1] + reach.fade[i - 2]));
  }
  // Step x = 111.2 m / 150 km: slope at most 1.5, curvature at most 6 (of 1 - 3x^2 + 2x^3).
  const double step = distance_m(cells[0], cells[1]) / 150e3;
  CHECK(steepest <= 1.5 * step * (1 + 1e-6));
  CHECK(sharpest <= 6 * step * step * (1 + 1e-6));
}

TEST_CASE("no seams: carried values change in proportion to the step, across radius and neighbour cut-off") {
  std::mt19937_64 random(5);
  for (const int count : {12, 700}) {
    const auto stations = random_points(count, 4, 21);
    std::vector<double> values;
    for (int i = 0; i < count; ++i) values.push_back(static_cast<double>(random() >> 11) * 0x1p-53);
    Options options;
    options.radius_m = count == 12 ? 90e3 : 300e3;
    options.neighbours = 8;
    const double coarse = largest_step(stations, options, at(9, 44.5), at(15, 49.3), 20000, values);
    const double fine = largest_step(stations, options, at(9, 44.5), at(15, 49.3), 80000, values);
    INFO("stations " << count << ": largest step " << coarse << ", at a quarter of the distance " << fine);
    CHECK(coarse < 0.02);
    // A seam would keep its height; a continuous value's largest step shrinks with the distance.
    CHECK(fine < 0.27 * coarse);
  }
}

TEST_CASE("the order of stations matters no more than rounding") {
  const auto stations = random_points(600, 4, 31);
  const auto cells = random_points(300, 4, 32);
  std::vector<std::size_t> order(stations.size());
  std::iota(order.begin(), order.end(), 0u);
  std::shuffle(order.begin(), order.end(), std::mt19937_64(33));
  std::vector<GeoPoint> shuffled;
  for (const auto i : order) shuffled.push_back(stations[i]);
  const ReachMap a = make_reach(stations, cells, {});
  const ReachMap b = make_reach(shuffled, cells, {});
  REQUIRE(a.map.row_start == b.map.row_start);
  CHECK(a.fade == b.fade);
  double worst = 0;
  for (std::size_t i = 0; i < cells.size(); ++i) {
    std::vector<double> one(stations.size(), 0), two(stations.size(), 0);
    for (auto p = a.map.row_start[i]; p < a.map.row_start[i + 1]; ++p) one[a.map.column[p]] = a.map.share[p];
    for (auto p = b.map.row_start[i]; p < b.map.row_start[i + 1]; ++p) two[order[b.map.column[p]]] = b.map.share[p];
    for (std::size_t j = 0; j < one.size(); ++j) worst = std::max(worst, std::abs(one[j] - two[j]));
  }
  CHECK(worst < 1e-14);
}

TEST_CASE("the map does not depend on the number of threads") {
  const auto stations = random_points(40, 4, 41);
  const auto cells = random_points(5000, 5, 42);
  const int threads = omp_get_max_threads();
  omp_set_num_threads(1);
  const ReachMap one = make_reach(stations, cells, {});
  omp_set_num_threads(4);
  const ReachMap four = make_reach(stations, cells, {});
  omp_set_num_threads(threads);
  CHECK(one.map == four.map);
  CHECK(one.fade == four.fade);
}

}  // namespace windrow::reach
