// Laws of bilinear and nearest sampling.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <random>

#include "shapeless.h"
#include "windrow/overlap/methods.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::LinearMap;
using sphere::Vec3;

namespace {

GeoPoint at(double lon, double lat) { return {Angle::degrees(lon), Angle::degrees(lat)}; }

double applied(const LinearMap& map, std::size_t row, const std::vector<double>& field) {
  if (map.row_start[row] == map.row_start[row + 1]) return std::nan("");
  double sum = 0;
  for (auto p = map.row_start[row]; p < map.row_start[row + 1]; ++p) sum += map.share[p] * field[map.column[p]];
  return sum;
}

std::vector<double> centre_values(const mesh::Mesh& grid, const std::function<double(double, double)>& f) {
  std::vector<double> out;
  for (std::size_t k = 0; k < grid.size(); ++k) {
    const GeoPoint c = grid.centre(k);
    out.push_back(f(c.longitude.degrees(), c.latitude.degrees()));
  }
  return out;
}

std::vector<double> noise(std::size_t count, unsigned seed) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> normal;
  std::vector<double> out;
  for (std::size_t k = 0; k < count; ++k) out.push_back(normal(random));
  return out;
}

std::vector<GeoPoint> scattered(std::size_t count, unsigned seed) {
  std::mt19937_64 random(seed);
  std::uniform_real_distribution<double> uniform;
  std::vector<GeoPoint> out;
  for (std::size_t k = 0; k < count; ++k) {
    out.push_back(at(-180 + 360 * uniform(random), std::asin(2 * uniform(random) - 1) / kDegree));
  }
  return out;
}

void check_weights(const LinearMap& map) {
  double worst = 0, least = 1;
  bool ascending = true;
  for (std::size_t r = 0; r < map.rows(); ++r) {
    double sum = 0;
    for (auto p = map.row_start[r]; p < map.row_start[r + 1]; ++p) {
      sum += map.share[p];
      least = std::min(least, map.share[p]);
      if (p > map.row_start[r]) ascending = ascending && map.column[p - 1] < map.column[p];
    }
    if (map.row_start[r] < map.row_start[r + 1]) worst = std::max(worst, std::abs(sum - 1));
  }
  CHECK(worst < 1e-14);
  CHECK(least > 0);
  CHECK(ascending);
}

/// Every kind of source that has a way of its own: rows and columns, a rotated frame, quadrilaterals, triangles.
std::vector<mesh::MeshPtr> global_sources() {
  std::vector<mesh::HealpixCell> cells;
  for (std::uint64_t k = 0; k < 12 * 64; ++k) cells.push_back({3, k});
  const auto healpix = mesh::make_healpix(cells, 0, mesh::Earth::sphere(kRadius_m), "healpix");
  const auto grid = regular(-180, -90, 10, 9, 20, 36);
  return {grid,
          healpix,
          curvilinear(*regular(-180, -90, 12, 9, 20, 30)),
          mesh::make_rotated({even_edges(-180, 12, 30), even_edges(-90, 10, 18)}, {-162, 39.25, 0},
                             mesh::Earth::sphere(kRadius_m), "rotated"),
          std::make_shared<Shapeless>(std::vector<mesh::MeshPtr>{grid}),
          reduced({5, 12, 18, 23, 26, 26, 23, 18, 12, 5})};
}

}  // namespace

TEST_CASE("weights are positive and sum to 1; at a centre it is that cell alone") {
  std::vector<mesh::MeshPtr> sources = global_sources();
  sources.push_back(azimuthal_mesh({10, 50}, 15, 20, 100e3));
  sources.push_back(azimuthal_mesh({0, 90}, 30, 30, 200e3));
  for (const mesh::MeshPtr& source : sources) {
    CAPTURE(source->describe());
    const LinearMap map = overlap::bilinear(*source, *mesh::make_points(scattered(1000, 5), source->earth()));
    check_weights(map);
    const LinearMap own = overlap::bilinear(*source, *source);
    CHECK(own.pairings() == source->size());
    bool same = own.rows() == own.pairings();
    for (std::size_t k = 0; k < own.pairings() && same; ++k) same = own.column[k] == k && own.share[k] == 1;
    CHECK(same);
  }
}

TEST_CASE("bilinear is exact for fields linear in the grid's own coordinates") {
  const auto f = [](double lon, double lat) { return 3 - 0.7 * lon + 1.3 * lat + 0.02 * lon * lat; };
  const auto source = regular(-20, 30, 2, 1.5, 12, 15);
  const auto target = regular(-18.7, 31.1, 0.37, 0.29, 50, 60);
  const LinearMap map = overlap::bilinear(*source, *target);
  const std::vector<double> field = centre_values(*source, f);
  double worst = 0;
  for (std::size_t r = 0; r < map.rows(); ++r) {
    const GeoPoint c = target->centre(r);
    worst = std::max(worst, std::abs(applied(map, r, field) - f(c.longitude.degrees(), c.latitude.degrees())));
  }
  CHECK(worst < 1e-12);
  // The same block in a rotated frame, targets turned along.
  const mesh::Rotation rotation{-162, 39.25, 0};
  const auto turned = mesh::make_rotated(*source->latlon(), rotation, source->earth(), "rotated");
  const auto turned_target = mesh::make_rotated(*target->latlon(), rotation, source->earth(), "rotated");
  const LinearMap turned_map = overlap::bilinear(*turned, *turned_target);
  worst = 0;
  for (std::size_t r = 0; r < map.rows(); ++r) {
    worst = std::max(worst, std::abs(applied(turned_map, r, field) - applied(map, r, field)));
  }
  CHECK(worst < 1e-10);
}

TEST_CASE("bilinear of a smooth field is right to second order, in quadrilaterals and triangles, over both poles") {
  const auto f = [](double lon, double lat) {
    const double s = std::cos(lat * kDegree), z = std::sin(lat * kDegree);
    return 2 + s * std::cos(lon * kDegree - 1) + s * z * std::sin(lon * kDegree) + z * z;
  };
  const auto worst = [&](const mesh::Mesh& source, const std::vector<GeoPoint>& points) {
    const LinearMap map = overlap::bilinear(source, *mesh::make_points(points, source.earth()));
    const std::vector<double> field = centre_values(source, f);
    double most = 0;
    for (std::size_t r = 0; r < points.size(); ++r) {
      const double got = applied(map, r, field);
      if (std::isnan(got)) continue;
      most = std::max(most, std::abs(got - f(points[r].longitude.degrees(), points[r].latitude.degrees())));
    }
    return most;
  };
  const std::vector<GeoPoint> points = scattered(2000, 3);
  std::vector<GeoPoint> inner;  // where a cap of 30 degrees about the pole has centres all round
  for (const GeoPoint& p : points) {
    if (p.latitude.degrees() > 65) inner.push_back(p);
  }
  const auto sizes = [](double factor) {
    std::vector<std::size_t> out;
    for (const double n : {5., 12., 18., 23., 26., 26., 23., 18., 12., 5.}) {
      for (int k = 0; k < static_cast<int>(factor); ++k) out.push_back(static_cast<std::size_t>(n * factor));
    }
    return out;
  };
  const auto halves = [](double coarse, double fine) {
    CAPTURE(coarse);
    CAPTURE(fine);
    CHECK(coarse < 0.1);
    CHECK(fine < 0.35 * coarse);
  };
  const auto coarse = regular(0, -90, 10, 9, 20, 36), fine = regular(0, -90, 5, 4.5, 40, 72);
  halves(worst(*coarse, points), worst(*fine, points));
  halves(worst(Shapeless({coarse}), points), worst(Shapeless({fine}), points));
  halves(worst(*reduced(sizes(1)), points), worst(*reduced(sizes(2)), points));
  halves(worst(*azimuthal_mesh({0, 90}, 12, 12, 600e3), inner), worst(*azimuthal_mesh({0, 90}, 24, 24, 300e3), inner));
}

TEST_CASE("bilinear results are continuous across cell borders, the date line and the poles") {
  // Zooming in where a result changes most along a path: a slope's change shrinks with the step, a jump's stays.
  std::vector<mesh::MeshPtr> sources = global_sources();
  sources.push_back(azimuthal_mesh({0, 90}, 12, 12, 700e3));
  const std::vector<std::array<GeoPoint, 2>> paths{{at(160, -23), at(-150, 31)},
                                                   {at(20, 83), at(-155, 86)},
                                                   {at(7, 55), at(171.3, 77)},
                                                   {at(-100, -71), at(60, -84)}};
  struct Span {
    Vec3 from, to;
    double change = 0;
  };
  for (const mesh::MeshPtr& source : sources) {
    CAPTURE(source->describe());
    const std::vector<double> field = noise(source->size(), 17);
    // Parts of spans, those with the largest changes first.
    const auto split = [&](const std::vector<Span>& spans, int parts) {
      std::vector<Span> out;
      std::vector<GeoPoint> points;
      for (const Span& span : spans) {
        for (int k = 0; k <= parts; ++k) {
          const auto along = [&](int step) {
            return sphere::unit(span.from + (static_cast<double>(step) / parts) * (span.to - span.from));
          };
          const Vec3 p = along(k);
          points.push_back(
              {Angle::radians(std::atan2(p.y, p.x)), Angle::radians(std::atan2(p.z, std::hypot(p.x, p.y)))});
          if (k < parts) out.push_back({p, along(k + 1)});
        }
      }
      const LinearMap map = overlap::bilinear(*source, *mesh::make_points(points, source->earth()));
      std::size_t next = 0;
      for (std::size_t row = 0; row + 1 < points.size(); ++row) {
        if (static_cast<int>(row) % (parts + 1) == parts) continue;
        const double change = std::abs(applied(map, row + 1, field) - applied(map, row, field));
        out[next++].change = change == change ? change : 0;  // outside the source's cells there is no value
      }
      std::sort(out.begin(), out.end(), [](const Span& a, const Span& b) { return a.change > b.change; });
      return out;
    };
    std::vector<Span> whole;
    for (const auto& [a, b] : paths) whole.push_back({sphere::point(a), sphere::point(b)});
    std::vector<Span> spans = split(whole, 500);
    const double wide = spans.front().change;
    for (int zoom = 0; zoom < 4; ++zoom) {
      spans.resize(150);
      spans = split(spans, 12);
    }
    CAPTURE(wide);
    CHECK(wide > 0.01);
    CHECK(spans.front().change < 1e-3 * wide);
  }
}

TEST_CASE("at a pole bilinear gives the mean of the last row") {
  const auto source = regular(0, -90, 20, 15, 12, 18);
  const std::vector<double> field = noise(source->size(), 23);
  const LinearMap map = overlap::bilinear(*source, *mesh::make_points({at(33, 90), at(-100, -90)}, source->earth()));
  double north = 0, south = 0;
  for (std::size_t k = 0; k < 18; ++k) {
    south += field[k] / 18;
    north += field[11 * 18 + k] / 18;
  }
  CHECK(applied(map, 0, field) == doctest::Approx(north).epsilon(1e-13));
  CHECK(applied(map, 1, field) == doctest::Approx(south).epsilon(1e-13));
}

TEST_CASE("beyond the outermost centres the nearest point of the hull counts; outside all cells nothing") {
  const auto source = regular(0, 40, 2, 2, 5, 5);
  const std::vector<double> field = noise(source->size(), 29);
  const LinearMap map = overlap::bilinear(
      *source, *mesh::make_points({at(0.2, 43), at(9.9, 49.9), at(6, 40.1), at(-0.1, 43)}, source->earth()));
  CHECK(applied(map, 0, field) == doctest::Approx(field[5]));
  CHECK(applied(map, 1, field) == doctest::Approx(field[24]));
  CHECK(applied(map, 2, field) == doctest::Approx(0.5 * (field[2] + field[3])));
  CHECK(map.row_start[3] == map.row_start[4]);
  const auto plane = azimuthal_mesh({10, 50}, 4, 4, 100e3);
  const LinearMap rim = overlap::bilinear(*plane, *azimuthal_mesh({10, 50}, 40, 40, 10e3));
  const std::vector<double> values = noise(plane->size(), 31);
  // Half a fine cell from the corner of the mesh: beyond the corner cell's centre along both axes.
  CHECK(applied(rim, 0, values) == doctest::Approx(values[0]).epsilon(1e-12));
  // On the rim, halfway between the centres of the second and third cell to within half a fine cell.
  const double between = applied(rim, 19, values);
  CHECK(between == doctest::Approx(0.55 * values[1] + 0.45 * values[2]).epsilon(1e-3));
}

TEST_CASE("the nearest centre is found as by trying all") {
  for (const mesh::MeshPtr& source : global_sources()) {
    CAPTURE(source->describe());
    const std::vector<GeoPoint> points = scattered(500, 37);
    const LinearMap map = overlap::nearest(*source, *mesh::make_points(points, source->earth()));
    REQUIRE(map.pairings() == points.size());
    std::size_t wrong = 0;
    for (std::size_t r = 0; r < points.size(); ++r) {
      double least = 4;
      std::size_t best = 0;
      for (std::size_t k = 0; k < source->size(); ++k) {
        const double d = norm(sphere::point(source->centre(k)) - sphere::point(points[r]));
        if (d < least - 1e-13) {
          least = d;
          best = k;
        }
      }
      if (map.column[r] != best || map.share[r] != 1) ++wrong;
    }
    CHECK(wrong == 0);
  }
}

TEST_CASE("of equally near centres the lower number counts; outside all cells none") {
  const auto source = regular(0, -10, 10, 10, 2, 4);
  const LinearMap map =
      overlap::nearest(*source, *mesh::make_points({at(10, 0), at(20, 3), at(25, 0), at(60, 0)}, source->earth()));
  CHECK(map.column == std::vector<std::uint32_t>{0, 5, 2});
  CHECK(map.row_start == std::vector<std::uint64_t>{0, 1, 2, 3, 3});
}
