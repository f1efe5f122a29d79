// Laws of rotated-pole and projected grids: axes with a mapping, or with what the job says in its place.
#include <doctest/doctest.h>

#include "sample_grid.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

using List = std::vector<double>;

struct Rotated {
  std::string name = "rotated.nc";
  std::vector<Length> order = {{"time", 2}, {"rlat", 3}, {"rlon", 4}};
  List rlat = {-1, 0, 1}, rlon = {-2, 0, 2, 4};
  bool mapping = true, flat_coordinates = false;
  std::function<void(FileBuilder&)> pole = [](FileBuilder& file) {
    file.att("grid_north_pole_longitude", NC_DOUBLE, {-162}).att("grid_north_pole_latitude", NC_FLOAT, {39.25});
  };

  [[nodiscard]] std::string write() const {
    FileBuilder file(name);
    with_time(with_dims(file, order), 2);
    file.var("rlat", NC_DOUBLE, {"rlat"}, rlat).att("standard_name", "grid_latitude").att("units", "degrees");
    file.var("rlon", NC_DOUBLE, {"rlon"}, rlon).att("standard_name", "grid_longitude").att("units", "degrees");
    if (mapping) {
      file.var("turned", NC_CHAR, {}, {}).att("grid_mapping_name", "rotated_latitude_longitude");
      pole(file);
    }
    if (flat_coordinates) {
      file.var("lat", NC_DOUBLE, {"rlat", "rlon"}, steps(40, 1, 12)).att("units", "degrees_north");
      file.var("lon", NC_DOUBLE, {"rlat", "rlon"}, steps(10, 1, 12)).att("units", "degrees_east");
    }
    file.var("v", NC_FLOAT, names(order),
             fill(order, [&](Index i) { return 10000 * double(i["time"]) + 100 * rlat[i["rlat"]] + rlon[i["rlon"]]; }));
    if (mapping) file.att("grid_mapping", "turned");
    if (flat_coordinates) file.att("coordinates", "lat lon");
    return file.done();
  }
};

struct Projected {
  std::string name = "projected.nc", units = "km", mapping = "lambert_conformal_conic", axis;
  std::vector<Length> order = {{"time", 2}, {"y", 3}, {"x", 4}};
  List y = {30, 20, 10}, x = {100, 102, 104, 106};
  bool standard_names = true;
  std::function<void(FileBuilder&)> more = [](FileBuilder&) {};

  [[nodiscard]] std::string write() const {
    FileBuilder file(name);
    with_time(with_dims(file, order), 2);
    for (const char* dim : {"y", "x"}) {
      file.var(dim, NC_DOUBLE, {dim}, dim == std::string("y") ? y : x);
      if (!units.empty()) file.att("units", units);
      if (standard_names) file.att("standard_name", std::string("projection_") + dim + "_coordinate");
    }
    file.var("v", NC_FLOAT, names(order),
             fill(order, [&](Index i) { return 10000 * double(i["time"]) + 100 * y[i["y"]] + x[i["x"]]; }));
    if (!mapping.empty()) file.att("grid_mapping", "crs");
    more(file);
    if (!mapping.empty())
      file.var("crs", NC_INT, {}, {})
          .att("grid_mapping_name", mapping)
          .att("standard_parallel", NC_DOUBLE, {25, 60})
          .att("crs_wkt", "PROJCRS[...]");
    return file.done();
  }
};

}  // namespace

TEST_CASE("a rotated grid is its axes and its pole, whatever the order of dimensions") {
  Rotated sample;
  for (const auto& order : orders(sample.order)) {
    sample.order = order;
    const auto run = open(sample.write());
    const cf::Grid& grid = run->grid();
    CHECK(grid.kind == cf::GridKind::rotated);
    CHECK(grid.rotation == mesh::Rotation{-162, 39.25, 0});
    CHECK(grid.edges.lat_deg == List{-1.5, -0.5, 0.5, 1.5});
    CHECK(grid.edges.lon_deg == List{-3, -1, 1, 3, 5});
    CHECK(grid.how ==
          "rotated pole at -162 E, 39.25 N, 1 x 2 degrees, 3 x 4 cells, -3 .. 5 and -1.5 .. 1.5 rotated degrees, edges "
          "half-way between centres (no bounds in the file)");
    CHECK(grid.why ==
          "axes 'rlat' (grid_latitude) and 'rlon' (grid_longitude), grid mapping 'turned' "
          "(rotated_latitude_longitude)");
    List expected;
    for (const double t : {0, 1})
      for (const double lat : sample.rlat)
        for (const double lon : sample.rlon) expected.push_back(10000 * t + 100 * lat + lon);
    CHECK(read_cells(*run) == expected);
  }
}

TEST_CASE("descending rotated latitudes give the same grid") {
  Rotated up, down;
  down.rlat = {1, 0, -1};
  const List values = read_cells(*open(up.write()));
  const auto run = open(down.write());
  CHECK(run->grid().edges.lat_deg == List{-1.5, -0.5, 0.5, 1.5});
  CHECK(read_cells(*run) == values);
}

TEST_CASE("a frame whose pole is the north pole is only turned: a latitude-longitude grid") {
  Rotated sample;
  sample.pole = [](FileBuilder& file) {
    file.att("grid_north_pole_longitude", NC_DOUBLE, {180}).att("grid_north_pole_latitude", NC_DOUBLE, {90});
  };
  CHECK(open(sample.write())->grid().kind == cf::GridKind::latlon);
  CHECK(open(sample.write())->grid().edges.lon_deg == List{-3, -1, 1, 3, 5});
  sample.pole = [](FileBuilder& file) {
    file.att("grid_north_pole_longitude", NC_DOUBLE, {-170}).att("grid_north_pole_latitude", NC_DOUBLE, {90});
    file.att("north_pole_grid_longitude", NC_DOUBLE, {4});
  };
  CHECK(open(sample.write())->grid().edges.lon_deg == List{3, 5, 7, 9, 11});
}

TEST_CASE(
    "without a mapping the pole comes from the job, else from two-dimensional coordinates, else it is asked for") {
  Rotated sample;
  sample.mapping = false;
  CHECK(refusal(sample.write()) ==
        "rotated.nc: variable 'v': 'rlat' and 'rlon' are axes of a rotated grid, but no grid mapping says where its "
        "pole stands; add grid = { pole = [LONGITUDE, LATITUDE] } to the [[run]]");
  cf::GridHints hints;
  hints.pole = {{-162, 39.25}};
  CHECK(open(sample.write(), hints)->grid().rotation == mesh::Rotation{-162, 39.25, 0});
  sample.flat_coordinates = true;
  Notices notices;
  CHECK(open(sample.write(), notices)->grid().kind == cf::GridKind::cells);
  CHECK(has(notices,
            "no grid mapping says where its pole stands; its two-dimensional latitudes and longitudes are used"));
}

TEST_CASE("two-dimensional coordinates that contradict the rotated axes are said") {
  Rotated sample;
  sample.flat_coordinates = true;
  Notices notices;
  CHECK(open(sample.write(), notices)->grid().kind == cf::GridKind::rotated);
  CHECK(has(notices, "'lat' and 'lon' depart from the rotated axes by up to"));
  Notices none;
  cf::open_run({WINDROW_TESTDATA "/cf/rcm_hsurf_rotated_alps.nc"}, "HSURF", none);
  CHECK(none.list().empty());
}

TEST_CASE("a pole off the globe is an error") {
  Rotated sample;
  sample.pole = [](FileBuilder& file) {
    file.att("grid_north_pole_longitude", NC_DOUBLE, {0}).att("grid_north_pole_latitude", NC_DOUBLE, {95});
  };
  CHECK(refusal(sample.write()) ==
        "rotated.nc: variable 'v': the rotated pole (0 E, 95 N, meridian 0) is not on the globe");
}

TEST_CASE("a projected grid is its axes and its mapping, whatever the order of dimensions") {
  Projected sample;
  for (const auto& order : orders(sample.order)) {
    sample.order = order;
    const auto run = open(sample.write());
    const cf::Grid& grid = run->grid();
    CHECK(grid.kind == cf::GridKind::projected);
    CHECK(grid.y_edges == List{5, 15, 25, 35});
    CHECK(grid.x_edges == List{99, 101, 103, 105, 107});
    CHECK(grid.axis_units == "km");
    REQUIRE(grid.mapping.size() == 3);
    CHECK(grid.mapping[1].numbers == List{25, 60});
    CHECK(grid.mapping[2].text == "PROJCRS[...]");
    CHECK(grid.how ==
          "projected (lambert_conformal_conic), 2 x 10 km, 3 x 4 cells, x 99 .. 107, y 5 .. 35 km, edges half-way "
          "between centres (no bounds in the file)");
    List expected;
    for (const double t : {0, 1})
      for (const double y : {10, 20, 30})
        for (const double x : sample.x) expected.push_back(10000 * t + 100 * y + x);
    CHECK(read_cells(*run) == expected);
  }
}

TEST_CASE("axes in radians are handed on, other lengths become metres") {
  Projected sample;
  sample.mapping = "geostationary";
  sample.units = "rad";
  sample.x = {-0.1, -0.05, 0, 0.05};
  sample.y = {0.1, 0.2, 0.3};
  CHECK(open(sample.write())->grid().axis_units == "radian");
  CHECK(open(sample.write())->grid().x_edges.back() == doctest::Approx(0.075).epsilon(1e-14));
  sample.units = "100 m";
  CHECK(open(sample.write())->grid().axis_units == "m");
  CHECK(open(sample.write())->grid().x_edges.back() == doctest::Approx(7.5).epsilon(1e-14));
}

TEST_CASE("axes are known by axis and units, or by their names within a mapping, and the latter is said") {
  Projected sample;
  sample.standard_names = false;
  Notices notices;
  CHECK(open(sample.write(), notices)->grid().kind == cf::GridKind::projected);
  CHECK(has(notices, "'y' is taken for the projection's y axis by its name alone"));
}

TEST_CASE("without a mapping the CRS comes from the job, else it is asked for") {
  Projected sample;
  sample.mapping.clear();
  CHECK(
      refusal(sample.write()) ==
      "projected.nc: variable 'v': 'x' and 'y' are axes of a projection, but no grid mapping says which; add grid = { "
      "crs = \"...\" } to the [[run]]");
  cf::GridHints hints;
  hints.crs = "EPSG:3035";
  CHECK(open(sample.write(), hints)->grid().crs == "EPSG:3035");
  sample.units.clear();
  CHECK(refusal(sample.write(), hints) ==
        "projected.nc: variable 'v': axes 'x' and 'y' have no units; add grid = { units = \"m\" } (or \"km\", "
        "\"radian\") to the [[run]]");
  hints.axis_units = "km";
  CHECK(open(sample.write(), hints)->grid().axis_units == "km");
  sample.units = "km";
  sample.more = [](FileBuilder& file) {
    file.att("coordinates", "lat lon");
    const std::vector<Length> dims = {{"y", 3}, {"x", 4}};
    file.var("lat", NC_DOUBLE, {"y", "x"}, fill(dims, [](Index i) { return 50 - double(i["y"]); }));
    file.att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"y", "x"}, fill(dims, [](Index i) { return 5 + double(i["x"]); }));
    file.att("units", "degrees_east");
  };
  Notices notices;
  CHECK(open(sample.write(), notices)->grid().kind == cf::GridKind::cells);
  CHECK(has(notices, "no grid mapping says which; its two-dimensional latitudes and longitudes are used"));
}

TEST_CASE("of a grid mapping that lists several, the one of the variable's own axes counts") {
  Projected sample;
  sample.more = [](FileBuilder& file) {
    file.att("grid_mapping", "globe: lat lon crs: x y");
    file.var("globe", NC_INT, {}, {}).att("grid_mapping_name", "latitude_longitude");
  };
  CHECK(open(sample.write())->grid().kind == cf::GridKind::projected);
}

TEST_CASE("bounds decide the edges of a plane's axes; gaps are errors in the axis' own units") {
  Projected sample;
  sample.more = [](FileBuilder& file) { file.dim("two", 2); };
  sample.x = {100, 102, 104, 109};
  CHECK(refusal(sample.write()) ==
        "projected.nc: coordinate 'x': gap between 104 and 109 km while the other cells are 2 km apart; a grid without "
        "gaps is needed");
}

TEST_CASE("the older attribute edges gives the bounds of an axis") {
  FileBuilder file("edges.nc");
  file.dim("lat", 2).dim("lon", 2).dim("lat_e", 3).dim("lon_e", 3);
  file.var("lat", NC_DOUBLE, {"lat"}, {10, 30}).att("units", "degrees_north").att("edges", "lat_e");
  file.var("lat_e", NC_DOUBLE, {"lat_e"}, {0, 20, 50});
  file.var("lon", NC_DOUBLE, {"lon"}, {10, 30}).att("units", "degrees_east").att("edges", "lon_e");
  file.var("lon_e", NC_DOUBLE, {"lon_e"}, {0, 22, 50});
  file.var("v", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 4));
  const auto run = open(file.done());
  CHECK(run->grid().edges.lat_deg == List{0, 20, 50});
  CHECK(run->grid().edges.lon_deg == List{0, 22, 50});
}
