// Laws of cells along one dimension: vertices listed, rows of reduced grids, gathered points, stations.
#include <doctest/doctest.h>

#include <cmath>

#include "sample_grid.h"
#include "windrow/mesh/mesh.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

using List = std::vector<double>;
constexpr double kFill = 1e20;

/// Values of (time, cell): 100 time + cell, in either order.
FileBuilder& with_values(FileBuilder& file, bool time_first, std::size_t cells, const std::string& dim) {
  std::vector<Length> dims = {{"time", 2}, {dim, cells}};
  if (!time_first) std::swap(dims[0], dims[1]);
  file.var("v", NC_FLOAT, names(dims), fill(dims, [&](Index i) { return 100 * double(i["time"]) + double(i[dim]); }));
  return file;
}
List expected(const List& cells) {
  List values = cells;
  for (const double cell : cells) values.push_back(100 + cell);
  return values;
}

struct Listed {
  std::string name = "listed.nc";
  bool time_first = true;
  List lon = {0.5, 1.5, 0.5}, lat = {0.3, 0.6, 2};
  // A triangle, a triangle, a pentagon; unused vertices are fill.
  List lon_v = {0, 1, 0, kFill, kFill, 1, 2, 2, kFill, kFill, 0, 1, 1, 0.5, 0};
  List lat_v = {0, 0, 1, kFill, kFill, 0, 0, 1, kFill, kFill, 1, 1, 3, 3.5, 3};
  double nan_cell = -1;

  [[nodiscard]] std::string write() const {
    FileBuilder file(name);
    const std::size_t n = lon.size(), nv = lon_v.size() / n;
    file.dim("time", 2).dim("cell", n).dim("nv", nv);
    with_time(file, 2);
    file.var("lat", NC_DOUBLE, {"cell"}, lat).att("units", "degrees_north").att("bounds", "lat_b");
    file.att("_FillValue", NC_DOUBLE, {kFill});
    file.var("lon", NC_DOUBLE, {"cell"}, lon).att("units", "degrees_east").att("bounds", "lon_b");
    file.att("_FillValue", NC_DOUBLE, {kFill});
    file.var("lat_b", NC_DOUBLE, {"cell", "nv"}, lat_v).var("lon_b", NC_DOUBLE, {"cell", "nv"}, lon_v);
    return with_values(file, time_first, n, "cell").att("coordinates", "lat lon").done();
  }
};

/// A reduced grid of `rows` given as (latitude, points), longitudes from 0 on.
struct Reduced {
  std::vector<std::pair<double, std::size_t>> rows;
  bool compress = false, time_first = true;
  std::string feature;

  [[nodiscard]] std::string write() const {
    List lat, lon;
    for (const auto& [latitude, count] : rows)
      for (std::size_t i = 0; i < count; ++i) {
        lat.push_back(latitude);
        lon.push_back(360.0 * double(i) / double(count));
      }
    FileBuilder file("reduced.nc");
    file.dim("time", 2).dim("rgrid", lat.size()).dim("latdim", rows.size()).dim("londim", 64);
    with_time(file, 2);
    if (compress) file.var("rgrid", NC_INT, {"rgrid"}, steps(0, 1, lat.size())).att("compress", "latdim londim");
    file.var("lat", NC_DOUBLE, {"rgrid"}, lat).att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"rgrid"}, lon).att("units", "degrees_east");
    with_values(file, time_first, lat.size(), "rgrid").att("coordinates", "lat lon");
    if (!feature.empty()) file.global().att("featureType", feature);
    return file.done();
  }
};

/// The sum of cell areas over those of the sphere, of latitude-longitude rectangles.
double share_of_globe(const mesh::CellCorners& corners) {
  double sum = 0;
  for (std::size_t cell = 0; cell < corners.nx; ++cell) {
    double west = 1e9, east = -1e9, south = 90, north = -90;
    for (std::size_t k = cell * corners.most; k < (cell + 1) * corners.most; ++k) {
      if (std::isnan(corners.lat_deg[k])) continue;
      west = std::min(west, corners.lon_deg[k]);
      east = std::max(east, corners.lon_deg[k]);
      south = std::min(south, corners.lat_deg[k]);
      north = std::max(north, corners.lat_deg[k]);
    }
    sum += (east - west) / 360 * (std::sin(north * M_PI / 180) - std::sin(south * M_PI / 180)) / 2;
  }
  return sum;
}

}  // namespace

TEST_CASE("listed cells keep their own numbers of corners, whatever the order of dimensions") {
  for (const bool time_first : {true, false}) {
    Listed sample;
    sample.time_first = time_first;
    const auto run = open(sample.write());
    const cf::Grid& grid = run->grid();
    REQUIRE(grid.kind == cf::GridKind::cells);
    CHECK(grid.corners.ny == 1);
    CHECK(grid.corners.nx == 3);
    CHECK(grid.corners.most == 5);
    CHECK(grid.corners.lon_deg[1] == 1);
    CHECK(std::isnan(grid.corners.lon_deg[3]));
    CHECK(grid.corners.lat_deg[13] == 3.5);
    CHECK(grid.sides == mesh::Sides::great_circles);
    CHECK(grid.how == "3 cells listed, 3 to 5 corners each from the file's bounds 'lat_b', sides along great circles");
    CHECK(grid.why ==
          "one-dimensional coordinates 'lat' (degrees_north) and 'lon' (degrees_east) over one dimension 'cell' with "
          "vertex bounds");
    CHECK(read_cells(*run) == expected({0, 1, 2}));
  }
}

TEST_CASE("listed cells that are latitude-longitude rectangles have sides along parallels") {
  Listed sample;
  sample.lon = {5, 359, 5};
  sample.lat = {5, 5, 85};
  sample.lon_v = {0, 10, 10, 0, 358, 360, 0, -2, 0, 10, 10, 0};
  sample.lat_v = {0, 0, 10, 10, 0, 0, 10, 10, 80, 80, 90, 90};
  CHECK(open(sample.write())->grid().sides == mesh::Sides::parallels);
  sample.lat_v[2] = 10.5;
  CHECK(open(sample.write())->grid().sides == mesh::Sides::great_circles);
}

TEST_CASE("two bounds a listed cell are the ends of a rectangle") {
  Listed sample;
  sample.lon_v = {0, 1, 1, 2, 0, 2};
  sample.lat_v = {0, 1, 0, 1, 1, 3};
  const auto run = open(sample.write());
  CHECK(run->grid().sides == mesh::Sides::parallels);
  CHECK(run->grid().corners.most == 4);
  CHECK(List(run->grid().corners.lon_deg.begin() + 8, run->grid().corners.lon_deg.end()) == List{0, 2, 2, 0});
  CHECK(List(run->grid().corners.lat_deg.begin() + 8, run->grid().corners.lat_deg.end()) == List{1, 1, 3, 3});
}

TEST_CASE("what the job says of a grid of another kind is not used, and that is said") {
  cf::GridHints hints;
  hints.crs = "EPSG:3035";
  hints.pole = {{0, 50}};
  Notices notices;
  open(Listed().write(), notices, hints);
  CHECK(has(notices, "the job's grid.crs is not used: the file holds no projected axes (3 cells listed"));
  CHECK(has(notices, "the job's grid.pole is not used: the file holds no rotated axes"));
}

TEST_CASE("listed cells without coordinates and repeated ones are left out and said") {
  Listed sample;
  sample.lon = {0.5, kFill, 360.5};
  sample.lat = {0.3, kFill, 0.3};
  sample.lon_v = {0, 1, 0, kFill, kFill, kFill, 361, 360, 360};
  sample.lat_v = {0, 0, 1, kFill, kFill, kFill, 0, 1, 0};
  Notices notices;
  const auto run = open(sample.write(), notices);
  CHECK(has(notices, "1 cell without coordinates is left out"));
  CHECK(has(notices, "1 cell repeating an earlier one's centre and corners is left out"));
  CHECK(run->grid().corners.nx == 1);
  CHECK(read_cells(*run) == expected({0}));
}

TEST_CASE("bounds with a missing corner before others, or in one coordinate only, are errors that name the cell") {
  Listed sample;
  sample.lon_v[1] = sample.lat_v[1] = kFill;
  CHECK(refusal(sample.write()) ==
        "listed.nc: cell 0 (counted from 0) of bounds 'lon_b' and 'lat_b' has a missing corner where others follow");
  sample = {};
  sample.lat_v[9] = 1;
  CHECK(
      refusal(sample.write()) ==
      "listed.nc: cell 1 (counted from 0) of bounds 'lon_b' and 'lat_b' has a missing corner where the other has one");
}

TEST_CASE("rows of a reduced Gaussian grid get quadrature edges and cover the globe") {
  const List latitudes = mesh::gaussian_latitudes_deg(8), edges = mesh::gaussian_edges_deg(8);
  Reduced sample;
  const std::size_t counts[] = {4, 8, 12, 16, 16, 12, 8, 4};
  for (std::size_t k = 0; k < 8; ++k) sample.rows.emplace_back(latitudes[7 - k], counts[k]);  // north first
  for (const bool compress : {false, true})
    for (const bool time_first : {true, false}) {
      sample.compress = compress;
      sample.time_first = time_first;
      const auto run = open(sample.write());
      const cf::Grid& grid = run->grid();
      REQUIRE(grid.kind == cf::GridKind::cells);
      CHECK(grid.gaussian);
      CHECK(grid.sides == mesh::Sides::parallels);
      CHECK(grid.corners.nx == 80);
      CHECK(share_of_globe(grid.corners) == doctest::Approx(1).epsilon(1e-14));
      CHECK(*std::ranges::max_element(grid.corners.lat_deg.begin(), grid.corners.lat_deg.begin() + 4) == 90);
      CHECK(std::ranges::count(grid.corners.lat_deg, edges[7]) > 0);
      CHECK(grid.how.starts_with("reduced Gaussian N4, 80 cells in 8 rows, row edges from quadrature weights"));
      CHECK(read_cells(*run) == expected(steps(0, 1, 80)));
    }
}

TEST_CASE("no side of a reduced grid's cell is longer than 60 degrees of longitude") {
  Reduced sample;
  for (const double lat : {-67.5, -22.5, 22.5, 67.5}) sample.rows.emplace_back(lat, 3);
  const auto run = open(sample.write());
  const mesh::CellCorners& corners = run->grid().corners;
  CHECK(run->grid().how.starts_with("reduced latitude-longitude, 12 cells in 4 rows"));
  CHECK(share_of_globe(corners) == doctest::Approx(1).epsilon(1e-14));
  for (std::size_t k = 0; k + 1 < corners.lon_deg.size(); ++k)
    if ((k + 1) % corners.most != 0) CHECK(std::abs(corners.lon_deg[k + 1] - corners.lon_deg[k]) <= 60 + 1e-9);
}

TEST_CASE("stations stay points, even in rows, and points in no rows are points") {
  Reduced sample;
  for (const double lat : {-67.5, -22.5, 22.5, 67.5}) sample.rows.emplace_back(lat, 3);
  sample.feature = "timeSeries";
  const auto run = open(sample.write());
  CHECK(run->grid().kind == cf::GridKind::points);
  REQUIRE(run->grid().points.size() == 12);
  CHECK(run->grid().points[4].longitude.degrees() == doctest::Approx(120));
  CHECK(run->grid().points[4].latitude.degrees() == doctest::Approx(-22.5));
  CHECK(read_cells(*run) == expected(steps(0, 1, 12)));
  sample.feature.clear();
  sample.rows = {{10, 3}, {20, 1}, {30, 3}, {5, 3}};
  CHECK(open(sample.write())->grid().kind == cf::GridKind::points);
}

TEST_CASE("points without coordinates are left out; a place of its own is one point") {
  FileBuilder file("points.nc");
  file.dim("station", 3);
  file.var("lat", NC_FLOAT, {"station"}, {1, 1e20, 3})
      .att("units", "degrees_north")
      .att("_FillValue", NC_FLOAT, {1e20});
  file.var("lon", NC_FLOAT, {"station"}, {1, 2, 3}).att("units", "degrees_east");
  file.var("v", NC_FLOAT, {"station"}, {7, 8, 9});
  Notices notices;
  const auto run = open(file.done(), notices);
  CHECK(has(notices, "1 point without coordinates is left out"));
  CHECK(read_cells(*run) == List{7, 9});

  FileBuilder mean("mean.nc");  // as area means are written
  mean.dim("time", 2).dim("lat", 1).dim("lon", 1);
  with_time(mean, 2);
  mean.var("lat", NC_DOUBLE, {"lat"}, {5}).att("units", "degrees_north");
  mean.var("lon", NC_DOUBLE, {"lon"}, {20}).att("units", "degrees_east");
  mean.var("v", NC_FLOAT, {"time", "lat", "lon"}, {1, 2});
  const auto one = open(mean.done());
  CHECK(one->grid().how == "one point without extent at 20 E, 5 N");
  CHECK(read_cells(*one) == List{1, 2});

  FileBuilder scalar("scalar.nc");
  scalar.dim("time", 2);
  with_time(scalar, 2);
  scalar.var("lat", NC_DOUBLE, {}, {5}).att("units", "degrees_north");
  scalar.var("lon", NC_DOUBLE, {}, {20}).att("units", "degrees_east");
  scalar.var("v", NC_FLOAT, {"time"}, {1, 2}).att("coordinates", "lat lon");
  CHECK(read_cells(*open(scalar.done())) == List{1, 2});
}

TEST_CASE("gathered points are cells of the whole grid, whichever way its axes and the list run") {
  for (const bool lat_first : {true, false})
    for (const bool time_first : {true, false}) {
      FileBuilder file("gathered.nc");
      file.dim("time", 2).dim("lat", 3).dim("lon", 4).dim("land", 3);
      with_time(file, 2);
      file.var("lat", NC_DOUBLE, {"lat"}, {30, 20, 10}).att("units", "degrees_north");
      file.var("lon", NC_DOUBLE, {"lon"}, {10, 20, 30, 40}).att("units", "degrees_east");
      // (30, 40), (20, 10), (10, 20)
      file.var("land", NC_INT, {"land"}, lat_first ? List{3, 4, 9} : List{9, 1, 5});
      file.att("compress", lat_first ? "lat lon" : "lon lat");
      with_values(file, time_first, 3, "land");
      const auto run = open(file.done());
      CHECK(run->grid().kind == cf::GridKind::latlon);
      CHECK(run->grid().edges.lat_deg == List{5, 15, 25, 35});
      CHECK(run->grid().subset == std::vector<std::uint32_t>{11, 4, 1});
      CHECK(run->grid().how.starts_with("3 gathered cells of: regular latitude-longitude, 10 x 10 degrees"));
      CHECK(read_cells(*run) == expected({0, 1, 2}));
    }
}

TEST_CASE("a list that leaves the gathered grid is an error, and a repeated cell is left out") {
  const auto write = [](List list) {
    FileBuilder file("gathered.nc");
    file.dim("lat", 3).dim("lon", 4).dim("land", 3);
    file.var("lat", NC_DOUBLE, {"lat"}, {10, 20, 30}).att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"lon"}, {10, 20, 30, 40}).att("units", "degrees_east");
    file.var("land", NC_INT, {"land"}, std::move(list)).att("compress", "lat lon");
    file.var("v", NC_FLOAT, {"land"}, {7, 8, 9});
    return file.done();
  };
  CHECK(refusal(write({0, 12, 1})) ==
        "gathered.nc: variable 'v': 'land' is 12 at position 1; the gathered dimensions have places 0 to 11");
  CHECK(refusal(write({0, 1, -1})).find("'land' is -1 at position 2") != std::string::npos);
  Notices notices;
  const auto run = open(write({5, 5, 6}), notices);
  CHECK(run->grid().subset == std::vector<std::uint32_t>{5, 6});
  CHECK(read_cells(*run) == List{7, 9});
  CHECK(has(notices, "1 gathered cell"));
}

TEST_CASE("latitudes and longitudes in radians become degrees, bounds with them") {
  FileBuilder file("radians.nc");
  file.dim("cell", 1).dim("nv", 3);
  file.var("lat", NC_DOUBLE, {"cell"}, {0.1}).att("standard_name", "latitude").att("units", "radian");
  file.att("bounds", "lat_b");
  file.var("lon", NC_DOUBLE, {"cell"}, {0.2}).att("standard_name", "longitude").att("units", "radian");
  file.att("bounds", "lon_b");
  file.var("lat_b", NC_DOUBLE, {"cell", "nv"}, {0, 0, 0.2}).var("lon_b", NC_DOUBLE, {"cell", "nv"}, {0.1, 0.3, 0.2});
  file.var("v", NC_FLOAT, {"cell"}, {1}).att("coordinates", "lat lon");
  const auto run = open(file.done());
  CHECK(run->grid().corners.centre_lat_deg[0] == doctest::Approx(0.1 * 180 / M_PI).epsilon(1e-15));
  CHECK(run->grid().corners.lon_deg[1] == doctest::Approx(0.3 * 180 / M_PI).epsilon(1e-15));
}
