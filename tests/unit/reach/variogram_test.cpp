// Laws of variograms and drifts: known ones are recovered from simulated fields, fallbacks are said.
#include "windrow/reach/variogram.h"

#include <doctest/doctest.h>

#include <cmath>

#include "points.h"
#include "windrow/base/constants.h"
#include "windrow/base/error.h"

namespace windrow::reach {
namespace {

/// Gaussian fields with the variogram's covariance at the points: [station * width], columns independent. A plain
/// Cholesky factor of its own; values have mean `season` and deviation 1 + `season` % 3.
std::vector<double> simulate(const std::vector<GeoPoint>& points, const Variogram& v, std::size_t width,
                             unsigned seed) {
  const std::size_t n = points.size();
  std::vector<std::vector<double>> l(n, std::vector<double>(n, 0));
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = 0; j <= i; ++j) {
      double d = distance_m(points[i], points[j]);
      if (v.model == Variogram::Model::gaussian) d = 2 * kEarthRadius_m * std::sin(d / (2 * kEarthRadius_m));
      double sum = i == j ? v.sill + 1e-9 : covariance(v, d);
      for (std::size_t k = 0; k < j; ++k) sum -= l[i][k] * l[j][k];
      l[i][j] = i == j ? std::sqrt(sum) : sum / l[j][j];
    }
  }
  Random random(seed);
  std::vector<double> values(n * width);
  for (std::size_t k = 0; k < width; ++k) {
    std::vector<double> e(n);
    for (double& x : e) x = random.normal();
    for (std::size_t i = 0; i < n; ++i) {
      double z = 0;
      for (std::size_t j = 0; j <= i; ++j) z += l[i][j] * e[j];
      values[i * width + k] = static_cast<double>(k) + static_cast<double>(1 + k % 3) * z;
    }
  }
  return values;
}

struct Spread {
  double mean = 0, error = 0;  ///< of the mean
};

Spread spread_of(const std::vector<double>& x) {
  Spread s;
  const auto n = static_cast<double>(x.size());
  for (const double v : x) s.mean += v / n;
  for (const double v : x) s.error += (v - s.mean) * (v - s.mean) / (n - 1);
  s.error = std::sqrt(s.error / n);
  return s;
}

}  // namespace

TEST_CASE("covariances fall from the partial sill to 5 % (spherical: 0) at the range") {
  for (const auto model : {Variogram::Model::exponential, Variogram::Model::spherical, Variogram::Model::gaussian}) {
    const Variogram v{model, 0.5, 2.5, 100};
    CHECK(covariance(v, 0) == 2);
    CHECK(covariance(v, 100) == doctest::Approx(model == Variogram::Model::spherical ? 0 : 2 * 0.049787068367863944));
    CHECK(covariance(v, 50) < covariance(v, 40));
  }
  // By hand: 1 - 0.75 + 0.0625; exp(-1.5); exp(-0.75).
  CHECK(covariance({Variogram::Model::spherical, 0, 1, 2}, 1) == 0.3125);
  CHECK(covariance({Variogram::Model::exponential, 0, 1, 2}, 1) == doctest::Approx(0.22313016014842982));
  CHECK(covariance({Variogram::Model::gaussian, 0, 1, 2}, 1) == doctest::Approx(0.4723665527410147));
}

TEST_CASE("a fit recovers the variogram of simulated fields within the sampling spread") {
  const auto points = random_points(90, 5, 101);
  for (const auto model : {Variogram::Model::exponential, Variogram::Model::spherical, Variogram::Model::gaussian}) {
    const Variogram truth{model, 0.2, 1, 150e3};
    std::vector<double> range, ratio;
    for (unsigned seed = 0; seed < 16; ++seed) {
      Notices notices;
      const Variogram fit = fit_variogram(points, simulate(points, truth, 12, 200 + seed), 12, {}, model, notices);
      range.push_back(fit.range_m / 150e3);
      ratio.push_back(fit.nugget / fit.sill);
    }
    const Spread r = spread_of(range), q = spread_of(ratio);
    MESSAGE("model " << static_cast<int>(model) << ": range " << r.mean << " +- " << r.error
                     << " of the true one, nugget " << q.mean << " +- " << q.error);
    CHECK(std::abs(r.mean - 1) < 3 * r.error);
    CHECK(std::abs(q.mean - 0.2) < 3 * q.error);
    CHECK(r.error < 0.05);
    CHECK(q.error < 0.03);
  }
}

TEST_CASE("the stations' own noise, given, does not go into the nugget") {
  const auto points = random_points(90, 5, 102);
  const Variogram truth{Variogram::Model::exponential, 0.1, 1, 200e3};
  std::vector<double> difference;
  for (unsigned seed = 0; seed < 12; ++seed) {
    auto values = simulate(points, truth, 10, 300 + seed);
    std::vector<double> variance(values.size());
    Random random(400 + seed);
    for (std::size_t i = 0; i < 90; ++i) {
      for (std::size_t k = 0; k < 10; ++k) {
        const double scale = static_cast<double>(1 + k % 3);
        variance[i * 10 + k] = (i % 2 == 0 ? 0.8 : 0.1) * scale * scale;
        values[i * 10 + k] += std::sqrt(variance[i * 10 + k]) * random.normal();
      }
    }
    Notices notices;
    const auto noise = standardised_noise(values, variance, 10);
    const Variogram fit = fit_variogram(points, values, 10, noise, truth.model, notices);
    difference.push_back(fit.nugget / fit.sill - 0.1);
  }
  const Spread d = spread_of(difference);
  MESSAGE("nugget's departure " << d.mean << " +- " << d.error);
  CHECK(std::abs(d.mean) < 3 * d.error);
  CHECK(d.error < 0.05);
}

TEST_CASE("adding a constant or a factor to a season leaves the fit") {
  const auto points = random_points(40, 5, 103);
  const auto values = simulate(points, {}, 4, 104);
  auto changed = values;
  for (std::size_t i = 0; i < 40; ++i) {
    changed[4 * i] += 100;
    changed[4 * i + 2] *= -7;
  }
  Notices notices;
  const Variogram a = fit_variogram(points, values, 4, {}, Variogram::Model::exponential, notices);
  const Variogram b = fit_variogram(points, changed, 4, {}, Variogram::Model::exponential, notices);
  CHECK(a.range_m == doctest::Approx(b.range_m).epsilon(1e-6));
  CHECK(a.nugget == doctest::Approx(b.nugget).epsilon(1e-6));
  CHECK(a.sill == doctest::Approx(b.sill).epsilon(1e-6));
}

TEST_CASE("too few stations, none that differ and pure noise fall back, and that is said") {
  Notices few;
  const std::vector<GeoPoint> two = {at(0, 0), at(2, 0)};
  const Variogram v = fit_variogram(two, {1, 2}, 1, {}, Variogram::Model::spherical, few);
  CHECK(v.nugget == 0.1);
  CHECK(v.sill == 1);
  CHECK(v.range_m == doctest::Approx(distance_m(two[0], two[1]) / 2));
  REQUIRE(few.list().size() == 1);
  CHECK(few.list()[0].text == "not fitted: 2 stations, at least 8 are needed; nugget 0.1 and range 111 km are taken");

  const auto points = random_points(60, 5, 105);
  Notices same;
  fit_variogram(points, std::vector<double>(60, 0.1), 1, {}, Variogram::Model::exponential, same);
  REQUIRE(same.list().size() == 1);
  CHECK(same.list()[0].text.find("not fitted: the stations do not differ") == 0);

  Notices place;
  std::vector<double> values(10);
  for (std::size_t i = 0; i < 10; ++i) values[i] = static_cast<double>(i);
  const auto one =
      fit_variogram(std::vector<GeoPoint>(10, at(3, 3)), values, 1, {}, Variogram::Model::exponential, place);
  CHECK(one.range_m == 100e3);
  CHECK(place.list()[0].text.find("not fitted: all stations stand in one place") == 0);

  Notices noise;
  Random random(106);
  std::vector<double> pure(60 * 40);
  for (double& x : pure) x = random.normal();
  const Variogram p = fit_variogram(points, pure, 40, {}, Variogram::Model::exponential, noise);
  CHECK(p.nugget == p.sill);
  CHECK(p.sill == doctest::Approx(1).epsilon(0.05));
  REQUIRE(noise.list().size() == 1);
  CHECK(noise.list()[0].text.find("pure nugget") != std::string::npos);
}

TEST_CASE("stations with a missing value are left out of fits") {
  auto points = random_points(40, 5, 107);
  auto values = simulate(points, {}, 3, 108);
  Notices notices;
  const Variogram without = fit_variogram(points, values, 3, {}, Variogram::Model::exponential, notices);
  points.push_back(at(12, 47));
  values.insert(values.end(), {1, std::nan(""), 2});
  CHECK(fit_variogram(points, values, 3, {}, Variogram::Model::exponential, notices) == without);
}

TEST_CASE("a drift is recovered: exactly without noise, within its spread with it") {
  const auto points = random_points(50, 4, 111);
  Random random(112);
  std::vector<double> height, plain;
  for (int i = 0; i < 50; ++i) {
    height.push_back(100 + 2000 * random.uniform());
    plain.push_back(3 - 0.0065 * height.back());
    plain.push_back(1 + 0.002 * height.back());
  }
  const Variogram v{Variogram::Model::exponential, 0.1, 1, 200e3};
  for (const bool generalised : {false, true}) {
    const std::optional<Variogram> used = generalised ? std::optional(v) : std::nullopt;
    Notices notices;
    const Drift exact = fit_drift(height, plain, 2, points, used, {}, notices);
    REQUIRE(exact.used);
    CHECK(notices.list().empty());
    CHECK(exact.slope[0] == doctest::Approx(-0.0065).epsilon(1e-11));
    CHECK(exact.slope[1] == doctest::Approx(0.002).epsilon(1e-11));
  }
  Notices notices;
  auto noisy = simulate(points, v, 200, 113);
  for (std::size_t i = 0; i < 50; ++i) {
    for (std::size_t k = 0; k < 200; ++k) {
      const double scale = static_cast<double>(1 + k % 3);
      noisy[i * 200 + k] = (noisy[i * 200 + k] - static_cast<double>(k)) / scale - 0.0065 * height[i];
    }
  }
  const Spread general = spread_of(fit_drift(height, noisy, 200, points, v, {}, notices).slope);
  const Spread ordinary = spread_of(fit_drift(height, noisy, 200, points, std::nullopt, {}, notices).slope);
  CHECK(std::abs(general.mean + 0.0065) < 3 * general.error);
  CHECK(std::abs(ordinary.mean + 0.0065) < 3 * ordinary.error);
  // What the covariance is for (Gauss-Markov).
  CHECK(general.error < ordinary.error);
}

TEST_CASE("no drift where heights hardly differ or stations are few, and that is said") {
  const auto points = random_points(6, 4, 114);
  Notices notices;
  const Drift flat = fit_drift({10, 20, 30, 100, 200, 309}, {1, 2, 3, 4, 5, 6}, 1, points, {}, {}, notices);
  CHECK(!flat.used);
  CHECK(flat.slope == std::vector<double>{0});
  const double missing = std::nan("");
  CHECK(!fit_drift({10, 20, 30, 1000, missing, missing}, {1, 2, 3, 4, 5, 6}, 1, points, {}, {}, notices).used);
  REQUIRE(notices.list().size() == 2);
  CHECK(notices.list()[0].text == "not used: the stations' heights span 299 m, under 300 m");
  CHECK(notices.list()[1].text == "not used: 4 stations with a height, at least 5 are needed");
  const Drift used = fit_drift({10, 20, 30, 100, 200, 310}, {1, 2, 3, 4, 5, 6}, 1, points, {}, {}, notices);
  CHECK(used.used);
  CHECK(drift_height(used, 5) == 10);
  CHECK(drift_height(used, 55) == 55);
  CHECK(drift_height(used, 4000) == 310);
  CHECK(std::isnan(drift_height(used, missing)));
}

}  // namespace windrow::reach
