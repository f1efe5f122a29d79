// Laws of kriging: the worked example, shares, honoured stations, no seams, places in common.
#include <doctest/doctest.h>
#include <omp.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "points.h"
#include "reach/kriging_system.h"
#include "windrow/base/constants.h"
#include "windrow/base/error.h"

namespace windrow::reach {
namespace {

Options kriging(double nugget, Variogram::Model model = Variogram::Model::exponential) {
  Options options;
  options.method = Method::kriging;
  options.variogram = {model, nugget, 1, 200e3};
  return options;
}

constexpr Variogram::Model kModels[] = {Variogram::Model::exponential, Variogram::Model::spherical,
                                        Variogram::Model::gaussian};

/// The point turned about the x axis, then about the z axis.
GeoPoint turned(GeoPoint p, double about_x, double about_z) {
  const double phi = p.latitude.radians(), lambda = p.longitude.radians();
  const double x = std::cos(phi) * std::cos(lambda), y = std::cos(phi) * std::sin(lambda), z = std::sin(phi);
  const double y2 = y * std::cos(about_x) - z * std::sin(about_x), z2 = y * std::sin(about_x) + z * std::cos(about_x);
  return {Angle::radians(std::atan2(y2, x) + about_z), Angle::radians(std::atan2(z2, std::hypot(x, y2)))};
}

std::vector<GeoPoint> turned(const std::vector<GeoPoint>& points, double about_x, double about_z) {
  std::vector<GeoPoint> out;
  for (const GeoPoint p : points) out.push_back(turned(p, about_x, about_z));
  return out;
}

double largest_difference(const ReachMap& a, const ReachMap& b) {
  REQUIRE(a.map.rows() == b.map.rows());
  double worst = 0;
  for (std::size_t i = 0; i < a.map.rows(); ++i) {
    std::vector<double> one(a.map.columns, 0), two(a.map.columns, 0);
    for (auto p = a.map.row_start[i]; p < a.map.row_start[i + 1]; ++p) one[a.map.column[p]] = a.map.share[p];
    for (auto p = b.map.row_start[i]; p < b.map.row_start[i + 1]; ++p) two[b.map.column[p]] = b.map.share[p];
    for (std::size_t j = 0; j < one.size(); ++j) worst = std::max(worst, std::abs(one[j] - two[j]));
  }
  return worst;
}

}  // namespace

TEST_CASE("ordinary kriging gives the worked example of Isaaks & Srivastava 1989, chapter 12") {
  // Seven samples about the point (65, 137), C(h) = 10 exp(-0.3 h), distances in the plane; inputs from memory, results
  // recomputed independently and as remembered from print: weights, mu, estimate 592.729, variance 8.956.
  const double x[] = {61, 63, 64, 68, 71, 73, 75};
  const double y[] = {139, 140, 129, 128, 140, 141, 128};
  const double v[] = {477, 696, 227, 646, 606, 791, 783};
  const double expected[] = {0.1729, 0.3178, 0.1287, 0.0864, 0.1511, 0.0572, 0.0858};
  const Variogram variogram{Variogram::Model::exponential, 0, 10, 10};
  std::vector<double> matrix, to_point(7 * kLanes, 0);
  for (int i = 0; i < 7; ++i) {
    for (int j = 0; j < 7; ++j) matrix.push_back(covariance(variogram, std::hypot(x[i] - x[j], y[i] - y[j])));
    to_point[static_cast<std::size_t>(i) * kLanes + 3] = covariance(variogram, std::hypot(x[i] - 65, y[i] - 137));
  }
  KrigingSystem system;
  system.set(matrix, 7, 10);
  CHECK(system.jitter() == 0);
  std::vector<double> weight = to_point, mu(kLanes), variance(kLanes);
  system.weights(weight.data(), mu.data());
  estimation_variance(matrix, 7, 10, weight.data(), to_point.data(), variance.data());
  double estimate = 0;
  for (std::size_t i = 0; i < 7; ++i) {
    CHECK(std::abs(weight[i * kLanes + 3] - expected[i]) < 0.00005);
    estimate += weight[i * kLanes + 3] * v[i];
  }
  CHECK(std::abs(estimate - 592.729) < 0.0005);
  CHECK(std::abs(variance[3] - 8.956) < 0.0005);
  CHECK(std::abs(mu[3] + 0.9066) < 0.00005);
}

TEST_CASE("kriging shares are non-negative, ascending in station and sum to 1; what was clipped is counted") {
  for (const int count : {1, 2, 40, 600}) {
    const auto stations = random_points(count, 6, 61);
    const auto cells = random_points(600, 8, 62);
    for (const auto model : kModels) {
      Options options = kriging(0.05, model);
      options.radius_m = 150e3;
      const ReachMap reach = make_reach(stations, cells, options);
      REQUIRE(reach.map.rows() == cells.size());
      REQUIRE(reach.variance.size() == cells.size());
      bool ordered = true, consistent = true;
      double worst = 0;
      for (std::size_t i = 0; i < cells.size(); ++i) {
        const auto from = reach.map.row_start[i], to = reach.map.row_start[i + 1];
        double nearest = 1e30, sum = 0;
        for (const auto& s : stations) nearest = std::min(nearest, distance_m(s, cells[i]));
        consistent = consistent && (to > from) == (nearest < options.radius_m) &&
                     (to > from) == std::isfinite(reach.variance[i]) && (to == from || reach.variance[i] >= 0);
        for (auto p = from; p < to; ++p) {
          ordered = ordered && reach.map.share[p] >= kSmallestShare / 2 &&
                    (p == from || reach.map.column[p - 1] < reach.map.column[p]) &&
                    distance_m(stations[reach.map.column[p]], cells[i]) < options.radius_m;
          sum += reach.map.share[p];
        }
        if (to > from) worst = std::max(worst, std::abs(sum - 1));
      }
      CHECK(worst < 1e-14);
      CHECK(ordered);
      CHECK(consistent);
      CHECK((reach.clipped > 0) == (count >= 40));
      CHECK(reach.clipped >= reach.clipped_cells);
      // The fade is that of the other methods.
      options.method = Method::inverse_distance;
      CHECK(reach.fade == make_reach(stations, cells, options).fade);
    }
  }
}

TEST_CASE("without nugget a station is honoured; with one the estimate passes it without a jump") {
  const auto stations = random_points(60, 4, 63);
  for (const auto model : kModels) {
    const ReachMap exact = make_reach(stations, stations, kriging(0, model));
    REQUIRE(exact.map.pairings() == stations.size());
    for (std::size_t i = 0; i < stations.size(); ++i) {
      CHECK(exact.map.column[i] == i);
      CHECK(exact.map.share[i] == 1);
      CHECK(exact.variance[i] < 1e-9);
    }
    const auto& s = stations[7];
    const std::vector<GeoPoint> beside = {s, north_of(s, 1e-7)};
    const ReachMap smooth = make_reach(stations, beside, kriging(0.2, model));
    std::vector<double> values(stations.size(), 0);
    values[7] = 1;
    CHECK(row_value(smooth, 0, values) < 0.95);
    CHECK(std::abs(row_value(smooth, 0, values) - row_value(smooth, 1, values)) < 1e-6);
    CHECK(smooth.variance[0] > 0.2);
  }
}

TEST_CASE("with more than 500 stations one is honoured too, and its neighbours alone carry") {
  const auto stations = random_points(520, 4, 64);
  const ReachMap exact = make_reach(stations, stations, kriging(0));
  REQUIRE(exact.map.pairings() == stations.size());
  CHECK(std::all_of(exact.map.share.begin(), exact.map.share.end(), [](double w) { return w == 1; }));
  Options options = kriging(0.1);
  options.neighbours = 9;
  const ReachMap few = make_reach(stations, random_points(200, 4, 65), options);
  for (std::size_t i = 0; i < 200; ++i) CHECK(few.map.row_start[i + 1] - few.map.row_start[i] <= 9);
}

TEST_CASE("a station's own sampling variance takes weight from it") {
  const std::vector<GeoPoint> stations = {at(10, 45), at(11, 45)};
  const std::vector<GeoPoint> middle = {at(10.5, 45)};
  Options options = kriging(0);
  CHECK(make_reach(stations, middle, options).map.share[0] == doctest::Approx(0.5).epsilon(1e-12));
  options.noise = {0.3, 0};
  // Two stations: w_1 - w_2 = (C_10 - C_20 - (K_11 - K_22) / 2) / ((K_11 + K_22) / 2 - C_12).
  const double c12 = std::exp(-3 * distance_m(stations[0], stations[1]) / 200e3);
  const double expected = (1 - 0.15 / (1.15 - c12)) / 2;
  CHECK(make_reach(stations, middle, options).map.share[0] == doctest::Approx(expected).epsilon(1e-9));
  options.noise = {0.3};
  CHECK_THROWS_WITH_AS(make_reach(stations, middle, options), "reach: 1 sampling variances for 2 stations", Error);
}

TEST_CASE("stations in one place share equally, and that is said") {
  auto stations = random_points(20, 3, 66);
  stations.push_back(at(30, 10));  // out of reach
  const auto cells = random_points(100, 3, 67);
  const ReachMap single = make_reach(stations, cells, kriging(0));
  stations.insert(stations.begin() + 4, stations[9]);  // 4 and 10 stand in one place
  Notices notices;
  const ReachMap twice = make_reach(stations, cells, kriging(0), &notices);
  REQUIRE(notices.list().size() == 1);
  CHECK(notices.list()[0].text ==
        "2 stations stand within 1 m of others and have neither nugget nor sampling variance: those of one place share "
        "equally");
  std::vector<double> one(21, 0), first(22, 0), second(22, 0);
  one[9] = 1;
  first[4] = second[10] = 1;
  double worst = 0;
  for (std::size_t i = 0; i < cells.size(); ++i) {
    CHECK(row_value(twice, i, first) == row_value(twice, i, second));
    worst = std::max(worst, std::abs(row_value(single, i, one) - 2 * row_value(twice, i, first)));
  }
  CHECK(worst < 1e-12);
  // With nugget they are two measurements: alike, but together not counting twice.
  Notices none;
  const ReachMap noisy = make_reach(stations, cells, kriging(0.1), &none);
  CHECK(none.list().empty());
  for (std::size_t i = 0; i < cells.size(); ++i) {
    CHECK(row_value(noisy, i, first) == doctest::Approx(row_value(noisy, i, second)).epsilon(1e-9));
  }
}

TEST_CASE("a singular system gets the smallest addition that helps, and that is said") {
  // 30 stations over 300 m, the Gaussian's range 200 km, no nugget: the matrix is all ones to 12 digits.
  std::vector<GeoPoint> stations;
  for (int i = 0; i < 30; ++i) stations.push_back(at(10 + 1e-4 * (i % 6), 45 + 1e-4 * (i / 6)));
  Notices notices;
  const auto cells = random_points(50, 0.5, 68);
  const ReachMap reach = make_reach(stations, cells, kriging(0, Variogram::Model::gaussian), &notices);
  REQUIRE(notices.list().size() == 1);
  CHECK(notices.list()[0].text.find("1e-12 of the sill added to the diagonal") != std::string::npos);
  const std::vector<double> constant(30, 3.5);
  for (std::size_t i = 0; i < 50; ++i) CHECK(row_value(reach, i, constant) == doctest::Approx(3.5).epsilon(1e-14));

  KrigingSystem system;
  system.set({1, 1, 0.2, 1, 1, 0.2, 0.2, 0.2, 1}, 3, 1);
  CHECK(system.jitter() == 1e-12);
  std::vector<double> x(3 * kLanes, 0.5), mu(kLanes);
  system.weights(x.data(), mu.data());
  CHECK(x[0] == doctest::Approx(0.25).epsilon(1e-3));
  CHECK(x[kLanes] == doctest::Approx(0.25).epsilon(1e-3));
}

TEST_CASE("turning the globe leaves the shares") {
  const auto stations = random_points(30, 4, 71);
  const auto cells = random_points(200, 5, 72);
  for (const auto model : kModels) {
    const Options options = kriging(0.1, model);
    const ReachMap here = make_reach(stations, cells, options);
    // Over the pole and over the date line.
    for (const double x : {0.7, 2.4}) {
      const ReachMap there = make_reach(turned(stations, x, 2.9), turned(cells, x, 2.9), options);
      CHECK(largest_difference(here, there) < 1e-6);  // a share about kSmallestShare may come or go
    }
  }
}

TEST_CASE("kriging leaves no seams across the radius and the neighbour cut-off") {
  for (const int count : {12, 700}) {
    const auto stations = random_points(count, 4, 21);
    Random random(5);
    std::vector<double> values;
    for (int i = 0; i < count; ++i) values.push_back(random.uniform());
    for (const double nugget : {0.0, 0.2}) {
      Options options = kriging(nugget);
      options.radius_m = count == 12 ? 90e3 : 300e3;
      options.neighbours = 8;
      const double coarse = largest_step(stations, options, at(9, 44.5), at(15, 49.3), 5000, values);
      const double fine = largest_step(stations, options, at(9, 44.5), at(15, 49.3), 20000, values);
      INFO("stations " << count << ", nugget " << nugget << ": largest step " << coarse << ", at a quarter " << fine);
      CHECK(coarse < 0.02);
      CHECK(fine < 0.27 * coarse);
    }
  }
}

TEST_CASE("the kriging map does not depend on the number of threads") {
  for (const int count : {40, 550}) {
    const auto stations = random_points(count, 4, 41);
    const auto cells = random_points(2100, 5, 42);
    const int threads = omp_get_max_threads();
    omp_set_num_threads(1);
    const ReachMap one = make_reach(stations, cells, kriging(0.1));
    omp_set_num_threads(2);
    const ReachMap two = make_reach(stations, cells, kriging(0.1));
    omp_set_num_threads(threads);
    CHECK(one.map == two.map);
    CHECK(one.fade == two.fade);
    CHECK(one.clipped == two.clipped);
    CHECK(std::equal(one.variance.begin(), one.variance.end(), two.variance.begin(),
                     [](double a, double b) { return a == b || (std::isnan(a) && std::isnan(b)); }));
  }
}

TEST_CASE("a cell's row does not depend on which cells it is computed with") {
  const auto stations = random_points(40, 4, 43);
  const auto cells = random_points(37, 5, 44);
  const ReachMap all = make_reach(stations, cells, kriging(0.1));
  for (std::size_t i = 0; i < cells.size(); ++i) {
    const ReachMap alone = make_reach(stations, {cells[i]}, kriging(0.1));
    const auto from = static_cast<std::ptrdiff_t>(all.map.row_start[i]);
    REQUIRE(alone.map.pairings() == all.map.row_start[i + 1] - all.map.row_start[i]);
    CHECK(std::equal(alone.map.share.begin(), alone.map.share.end(), all.map.share.begin() + from));
  }
}

TEST_CASE("kriging without stations in reach leaves rows empty; wrong variograms are refused") {
  CHECK(make_reach({}, {at(1, 2)}, kriging(0)).map.pairings() == 0);
  const ReachMap far = make_reach({at(40, 2)}, {at(1, 2)}, kriging(0));
  CHECK(far.map.pairings() == 0);
  CHECK(far.fade[0] == 0);
  CHECK(std::isnan(far.variance[0]));
  Options wrong = kriging(1.5);
  CHECK_THROWS_WITH_AS(
      make_reach({at(1, 2)}, {}, wrong),
      "variogram: nugget 1.5, sill 1, range 200000 m: expected 0 <= nugget <= sill, sill > 0, range > 0", Error);
}

TEST_CASE("leaving a station out gives what the map of the others gives") {
  auto stations = random_points(25, 3, 81);
  stations.push_back(north_of(stations[3], 0.01));  // 1.1 km from station 3
  Random random(82);
  std::vector<double> values(26 * 2);
  for (double& v : values) v = random.normal();
  for (const Method method : {Method::nearest, Method::inverse_distance, Method::kriging}) {
    Options options = kriging(0.1);
    options.method = method;
    options.noise.assign(26, 0.05);
    options.noise[8] = 0.5;
    const LeftOut out = leave_one_out(stations, values, 2, options);
    REQUIRE(out.value.size() == 52);
    for (const std::size_t i : {std::size_t{3}, std::size_t{12}}) {
      std::vector<GeoPoint> rest;
      std::vector<double> first, second;
      Options without = options;
      without.noise.clear();
      for (std::size_t j = 0; j < 26; ++j) {
        if (j == i || (i == 3 && j == 25)) continue;
        rest.push_back(stations[j]);
        without.noise.push_back(options.noise[j]);
        first.push_back(values[2 * j]);
        second.push_back(values[2 * j + 1]);
      }
      const ReachMap reach = make_reach(rest, {stations[i]}, without);
      CHECK(out.value[2 * i] == row_value(reach, 0, first));
      CHECK(out.value[2 * i + 1] == row_value(reach, 0, second));
      CHECK(out.fade[i] == reach.fade[0]);
    }
  }
  const LeftOut alone = leave_one_out({at(0, 0), at(90, 0)}, {1, 2}, 1, kriging(0));
  CHECK(std::isnan(alone.value[0]));
  CHECK(alone.fade[1] == 0);
}

}  // namespace windrow::reach
