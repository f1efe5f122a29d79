// Laws of areas on the sphere, against closed forms and published values.
#include <doctest/doctest.h>

#include <numbers>
#include <random>

#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

using namespace windrow;
using namespace windrow::sphere;

namespace {
constexpr double kPi = std::numbers::pi;

double radians(double degrees) { return degrees / 180 * kPi; }

// Corner to corner along meridians and parallels, for cells under 90 degrees.
Polygon box(double west, double east, double south, double north) {
  const Vec3 sw = point_degrees(west, south), se = point_degrees(east, south);
  const Vec3 nw = point_degrees(west, north), ne = point_degrees(east, north);
  const double width = radians(east - west), rise = radians(north - south);
  Loop loop;
  if (south > -90) loop.push_back({sw, se, Circle::parallel_degrees(south), width});
  loop.push_back({se, ne, Circle::meridian_degrees(east), -rise});
  if (north < 90) loop.push_back({ne, nw, Circle::parallel_degrees(north), -width});
  loop.push_back({nw, sw, Circle::meridian_degrees(west), rise});
  return {{{{loop}}}};
}

// Delta lambda times Delta sin phi, the latter without cancellation.
double box_area(double west, double east, double south, double north) {
  return radians(east - west) * 2 * std::cos(radians((south + north) / 2)) * std::sin(radians((north - south) / 2));
}
}  // namespace

TEST_CASE("a great-circle triangle has its published area") {
  // Triangle (0,0), (60,0), (30,30) degrees east/north: 0.2866951 sr as printed in public test suites, 0.28669513781
  // computed apart from this code.
  const double triangle = triangle_area(point_degrees(0, 0), point_degrees(60, 0), point_degrees(30, 30));
  CHECK(triangle == doctest::Approx(0.28669513781).epsilon(2e-11));
  CHECK(triangle_area(point_degrees(0, 0), point_degrees(30, 30), point_degrees(60, 0)) == -triangle);
  CHECK(triangle_area({1, 0, 0}, {0, 1, 0}, {0, 0, 1}) == doctest::Approx(kPi / 2).epsilon(1e-15));
}

TEST_CASE("a lens makes up the difference between parallel and great circle") {
  // Between a parallel and the pole: sector = geodesic triangle + lens, exactly Delta lambda (1 - sin phi).
  for (const double phi : {0.5, 30.0, 60.0, 89.0, 89.99}) {
    for (const double width : {0.01, 1.0, 2.8, 2.9, 20.0, 90.0}) {
      CAPTURE(phi);
      CAPTURE(width);
      const Circle c = Circle::parallel_degrees(phi);
      const double triangle = triangle_area(point_degrees(0, phi), point_degrees(width, phi), Vec3{0, 0, 1});
      const double sector = radians(width) * c.versine;
      CHECK(triangle + lens_area(c, radians(width)) == doctest::Approx(sector).epsilon(2e-15));
      CHECK(lens_area(c, -radians(width)) == -lens_area(c, radians(width)));
      CHECK(lens_area(c.reversed(), radians(width)) == -lens_area(c, radians(width)));
    }
  }
}

TEST_CASE("the lens series meets the closed form where it takes over") {
  for (const double phi : {1.0, 20.0, 45.0, 70.0, 89.0}) {
    const Circle c = Circle::parallel_degrees(phi);
    const double below = lens_area(c, std::nextafter(0.05, 0)), above = lens_area(c, 0.05);
    // The closed form loses a factor of 12 / theta² / r² of eps here; the series loses nothing.
    const double loss = 2.3e-16 * 0.05 * c.versine * 4;
    CHECK(std::abs(above - below) <= loss);
  }
}

TEST_CASE("latitude-longitude cells have Delta lambda times Delta sin phi") {
  double worst = 0;
  for (const double size : {30.0, 10.0, 5.0, 2.5, 1.0}) {
    for (double south = -90; south + size <= 90; south += size) {
      for (const double west : {-180.0, -3.3, 0.0, 77.7, 179.0}) {
        const double exact = box_area(west, west + size, south, south + size);
        worst = std::max(worst, std::abs(area(box(west, west + size, south, south + size)) / exact - 1) * size / 5);
      }
    }
  }
  CHECK(worst < 1e-14);  // relative, at 5 degrees; in proportion to 1 / size
  // 1 km cells: 0.009 degrees of latitude, as wide in longitude as makes them square.
  worst = 0;
  for (const double south : {-89.9, -60.0, -0.0045, 0.0, 12.3, 48.0, 80.0, 89.9}) {
    const double width = 0.009 / std::cos(radians(south));
    const double exact = box_area(-28, -28 + width, south, south + 0.009);
    worst = std::max(worst, std::abs(area(box(-28, -28 + width, south, south + 0.009)) / exact - 1));
  }
  CHECK(worst < 1e-11);
}

TEST_CASE("an arc rebuilt from its tilt passes through its middle and reverses to the same circle") {
  std::mt19937_64 random(20240501);
  std::uniform_real_distribution<double> u(-1, 1);
  for (int k = 0; k < 2000; ++k) {
    const double size = std::pow(10.0, -4.5 + 4 * std::abs(u(random)));
    const Vec3 a = unit({u(random), u(random), u(random)});
    const Vec3 b = unit(a + size * Vec3{u(random), u(random), u(random)});
    if (norm(b - a) < 0.1 * size) continue;
    const Vec3 left = unit(cross(a, b));
    const Vec3 m = unit(0.5 * (a + b) + 0.1 * norm(b - a) * u(random) * left);
    const double tilt = tilt_through(a, m, b);
    const Arc arc = arc_through(a, b, tilt);
    CAPTURE(size);
    CHECK(std::abs(height(arc.circle, a)) < 1e-15);
    CHECK(std::abs(height(arc.circle, b)) < 1e-15);
    CHECK(std::abs(height(arc.circle, m)) < 2e-15);
    CHECK(norm(point_on(arc, 1) - b) < 1e-15);
    const Arc back = arc_through(b, a, -tilt);
    CHECK(back.circle == arc.circle.reversed());
    CHECK(back.dtheta == arc.dtheta);
  }
}

TEST_CASE("a great-circle loop and a small circle have the areas of their caps") {
  const Polygon sphere_half = box(0, 90, 0, 90);
  CHECK(area(sphere_half) == doctest::Approx(kPi / 2).epsilon(1e-15));
  for (const double phi : {89.99, 60.0, 1.0, 0.0, -1.0, -60.0}) {
    CAPTURE(phi);
    Loop loop;
    for (int k = 0; k < 4; ++k) {
      loop.push_back(
          {point_degrees(90 * k, phi), point_degrees(90 * k + 90, phi), Circle::parallel_degrees(phi), kPi / 2});
    }
    const double s = std::sin(radians((90 - phi) / 2));
    CHECK(area({{{{loop}}}}) == doctest::Approx(4 * kPi * s * s).epsilon(1e-14));
  }
}
