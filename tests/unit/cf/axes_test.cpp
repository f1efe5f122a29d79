// Laws of recognising a latitude-longitude grid's axes from metadata, and of refusing what is no grid.
#include <doctest/doctest.h>

#include "sample_run.h"
#include "windrow/mesh/mesh.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

/// One fixed field on dimensions (b, a) with whatever coordinates the test gives.
std::string refusal(const std::string& path, const std::string& variable = "v") {
  return error_text(Failure::data, [&] {
    Notices notices;
    cf::open_run({path}, variable, notices);
  });
}

}  // namespace

TEST_CASE("every file format gives the same values at the same places") {
  for (const int mode : {0, NC_64BIT_OFFSET, NC_64BIT_DATA, NC_NETCDF4, NC_NETCDF4 | NC_CLASSIC_MODEL}) {
    CAPTURE(mode);
    Sample sample;
    sample.mode = mode;
    if (mode & NC_NETCDF4) sample.chunks = {3, 4, 7};
    const std::string path = sample.write();
    CHECK(cf::looks_like_netcdf(path));
    Notices notices;
    const auto run = cf::open_run({path}, "v", notices);
    CHECK(run->info().units == "K");
    check_places(*run, sample.time);
  }
}

TEST_CASE("the order of dimensions does not matter, and dimensions of length 1 are dropped") {
  std::vector<std::string> order = {"lat", "lon", "time"};
  do {
    for (const bool extra : {false, true}) {
      Sample sample;
      sample.mode = NC_NETCDF4;
      sample.order = order;
      if (extra) sample.order.insert(sample.order.begin() + 1, "one");
      sample.chunks = extra ? std::vector<std::size_t>{2, 1, 5, 3} : std::vector<std::size_t>{2, 5, 3};
      Notices notices;
      check_places(*cf::open_run({sample.write()}, "v", notices), sample.time);
    }
  } while (std::ranges::next_permutation(order).found);
}

TEST_CASE("units name latitude and longitude in every spelling CF allows; standard_name does as well") {
  struct Case {
    std::string lat, lon, standard_lat, standard_lon;
  };
  for (const Case& c : {Case{"degree_north", "degree_east", "", ""}, Case{"degree_N", "degree_E", "", ""},
                        Case{"degrees_N", "degrees_E", "", ""}, Case{"degreeN", "degreeE", "", ""},
                        Case{"degreesN", "degreesE", "", ""}, Case{"degrees", "degrees", "latitude", "longitude"}}) {
    FileBuilder file("units.nc");
    file.dim("p", 3).dim("q", 4);
    file.var("p", NC_DOUBLE, {"p"}, {10, 20, 30}).att("units", c.lat).att("standard_name", c.standard_lat);
    file.var("q", NC_DOUBLE, {"q"}, {10, 20, 30, 40}).att("units", c.lon).att("standard_name", c.standard_lon);
    file.var("v", NC_FLOAT, {"p", "q"}, steps(0, 1, 12));
    Notices notices;
    const auto run = cf::open_run({file.done()}, "v", notices);
    CHECK(run->grid().edges.lat_deg == std::vector<double>{5, 15, 25, 35});
    CHECK(run->frequency() == cf::Frequency::fixed);
    CHECK(notices.list().empty());
  }
}

TEST_CASE("names decide only as a last resort, and that is reported") {
  FileBuilder file("names.nc");
  file.dim("lat", 3).dim("lon", 3);
  file.var("lat", NC_DOUBLE, {"lat"}, {10, 20, 30}).att("units", "degrees");
  file.var("lon", NC_DOUBLE, {"lon"}, {10, 20, 30});
  file.var("v", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 9));
  Notices notices;
  cf::open_run({file.done()}, "v", notices);
  CHECK(texts(notices) == std::vector<std::string>{
                              "'lat' is taken for latitude by its name alone: it has no units, standard_name or axis "
                              "that says so",
                              "'lon' is taken for longitude by its name alone: it has no units, standard_name or "
                              "axis that says so"});
}

TEST_CASE("an auxiliary one-dimensional coordinate serves as axis, as lat(latitude)") {
  FileBuilder file("auxiliary.nc");
  file.dim("latitude", 2).dim("longitude", 3);
  file.var("lat", NC_FLOAT, {"latitude"}, {20, 10}).att("units", "degrees_north");
  file.var("lon", NC_FLOAT, {"longitude"}, {10, 20, 30}).att("units", "degrees_east");
  file.var("v", NC_FLOAT, {"latitude", "longitude"}, {0, 1, 2, 3, 4, 5});
  Notices notices;
  const auto run = cf::open_run({file.done()}, "v", notices);
  CHECK(read_all(*run) == std::vector<double>{3, 4, 5, 0, 1, 2});
}

TEST_CASE("string attributes of netCDF-4 are read like text") {
  FileBuilder file("strings.nc", NC_NETCDF4);
  file.dim("y", 2).dim("x", 3);
  file.var("y", NC_FLOAT, {"y"}, {10, 20}).strings("units", {"degrees_north"});
  file.var("x", NC_FLOAT, {"x"}, {10, 20, 30}).strings("units", {"degrees_east"});
  file.var("v", NC_FLOAT, {"y", "x"}, steps(0, 1, 6)).strings("cell_methods", {"area: mean", "time: mean"});
  file.att("numbers", NC_INT, {1, 2});
  file.global().strings("title", {"Invented"});
  Notices notices;
  const auto run = cf::open_run({file.done()}, "v", notices);
  CHECK(run->info().cell_methods == "area: mean time: mean");
  REQUIRE(run->info().attributes.size() == 2);
  CHECK(run->info().attributes[1].numbers == std::vector<double>{1, 2});
  REQUIRE(run->info().global_attributes.size() == 1);
  CHECK(run->info().global_attributes[0].text == "Invented");
}

TEST_CASE("what is no grid is refused in one clear line") {
  FileBuilder levels("levels.nc");
  levels.dim("lev", 3).dim("lat", 2).dim("lon", 2);
  levels.var("lev", NC_DOUBLE, {"lev"}, {1000, 850, 500}).att("units", "hPa");
  levels.var("lat", NC_DOUBLE, {"lat"}, {10, 20}).att("units", "degrees_north");
  levels.var("lon", NC_DOUBLE, {"lon"}, {10, 20}).att("units", "degrees_east");
  levels.var("v", NC_FLOAT, {"lev", "lat", "lon"}, steps(0, 1, 12));
  CHECK(refusal(levels.done()) ==
        "levels.nc: variable 'v': 3 levels along 'lev' (hPa); a field with a single level is needed");

  FileBuilder member("member.nc");
  member.dim("member", 3).dim("lat", 2).dim("lon", 2);
  member.var("lat", NC_DOUBLE, {"lat"}, {10, 20}).att("units", "degrees_north");
  member.var("lon", NC_DOUBLE, {"lon"}, {10, 20}).att("units", "degrees_east");
  member.var("v", NC_FLOAT, {"member", "lat", "lon"}, steps(0, 1, 12));
  CHECK(refusal(member.done()) ==
        "member.nc: variable 'v': further dimension 'member' of length 3; only dimensions of "
        "length 1 can be dropped");

  FileBuilder mapped("mapped.nc");
  mapped.dim("y", 2).dim("x", 2);
  mapped.var("crs", NC_INT, {}, {}).att("grid_mapping_name", "lambert_conformal_conic");
  mapped.var("v", NC_FLOAT, {"y", "x"}, steps(0, 1, 4)).att("grid_mapping", "crs");
  CHECK(refusal(mapped.done()) ==
        "mapped.nc: variable 'v': on a lambert_conformal_conic grid (grid mapping 'crs'), but its dimensions (y, x) "
        "have no coordinate variables that are its axes");

  FileBuilder track("track.nc");
  track.dim("time", 2);
  track.var("time", NC_DOUBLE, {"time"}, {1, 2}).att("units", "days since 2000-01-01");
  track.var("lat", NC_DOUBLE, {"time"}, {1, 2}).att("units", "degrees_north");
  track.var("lon", NC_DOUBLE, {"time"}, {1, 2}).att("units", "degrees_east");
  track.var("v", NC_FLOAT, {"time"}, steps(0, 1, 2));
  CHECK(refusal(track.done()) ==
        "track.nc: variable 'v': 'lat' varies along the time dimension 'time': this is a track, not a grid");

  FileBuilder stations("stations.nc");
  stations.dim("station", 2).dim("n", 2);
  stations.var("lat", NC_DOUBLE, {"station"}, {1, 2}).att("units", "degrees_north");
  stations.var("lon", NC_DOUBLE, {"station"}, {1, 2}).att("units", "degrees_east");
  stations.var("v", NC_FLOAT, {"station", "n"}, steps(0, 1, 4));
  CHECK(refusal(stations.done()) ==
        "stations.nc: variable 'v': further dimension 'n' of length 2; only dimensions of length 1 can be dropped");

  FileBuilder elsewhere("elsewhere.nc");
  elsewhere.dim("j", 2)
      .dim("i", 2)
      .var("v", NC_FLOAT, {"j", "i"}, steps(0, 1, 4))
      .att("coordinates", "nav_lat nav_lon");
  CHECK(refusal(elsewhere.done()) ==
        "elsewhere.nc: variable 'v': its coordinates nav_lat, nav_lon are not in the file; name the file that holds "
        "them with grid = { coordinates = \"...\" } in the [[run]]");

  FileBuilder bare("bare.nc");
  bare.dim("a", 2).dim("b", 2).var("v", NC_FLOAT, {"a", "b"}, steps(0, 1, 4));
  CHECK(refusal(bare.done()) ==
        "bare.nc: variable 'v': no grid can be recognised among its dimensions (a, b); expected coordinates with the "
        "units degrees_north and degrees_east, axes with a grid mapping, or a mesh; coordinates in another file are "
        "named with grid = { coordinates = \"...\" } in the [[run]]");
}

TEST_CASE("a missing variable names the near miss and what the file holds") {
  Sample sample;
  sample.name = "near.nc";
  CHECK(refusal(sample.write(), "w").starts_with("near.nc: no variable 'w'"));
  FileBuilder file("names2.nc");
  file.dim("lat", 2).dim("lon", 2);
  file.var("tasmax", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 4)).var("pr", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 4));
  CHECK(refusal(file.done(), "tasmx") ==
        "names2.nc: no variable 'tasmx'; did you mean 'tasmax'? (data variables in the file: tasmax, pr)");
}

TEST_CASE("coordinates, bounds, grid mappings and cell measures are no data variables") {
  FileBuilder file("data.nc");
  file.dim("lat", 2).dim("lon", 2).dim("two", 2);
  file.var("lat", NC_DOUBLE, {"lat"}, {10, 20}).att("units", "degrees_north").att("bounds", "lat_bnds");
  file.var("lat_bnds", NC_DOUBLE, {"lat", "two"}, {5, 15, 15, 25});
  file.var("lon", NC_DOUBLE, {"lon"}, {10, 20}).att("units", "degrees_east");
  file.var("crs", NC_INT, {}, {}).att("grid_mapping_name", "latitude_longitude");
  file.var("area", NC_DOUBLE, {"lat", "lon"}, steps(1, 1, 4));
  file.var("v", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 4)).att("grid_mapping", "crs").att("cell_measures", "area: area");
  file.var("w", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 4));
  CHECK(cf::data_variables(file.done()) == std::vector<std::string>{"v", "w"});
}

TEST_CASE("Gaussian latitudes without bounds get the edges of their quadrature weights, and that is said") {
  const std::vector<double> rows = mesh::gaussian_latitudes_deg(64), edges = mesh::gaussian_edges_deg(64);
  const auto write = [&](const std::string& name, std::vector<double> lat) {
    FileBuilder file(name);
    file.dim("lat", lat.size()).dim("lon", 128);
    for (double& value : lat) value = std::round(value * 1e4) / 1e4;  // as printed tables have them
    file.var("lat", NC_DOUBLE, {"lat"}, lat).att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"lon"}, steps(0, 2.8125, 128)).att("units", "degrees_east");
    file.var("v", NC_FLOAT, {"lat", "lon"}, steps(0, 1, lat.size() * 128));
    return file.done();
  };
  Notices notices;
  const auto global = cf::open_run({write("gaussian.nc", {rows.rbegin(), rows.rend()})}, "v", notices);
  CHECK(global->grid().gaussian);
  CHECK(global->grid().edges.lat_deg == edges);
  CHECK(global->grid().how ==
        "Gaussian N32, 64 x 128 cells, global, edges from quadrature weights in latitude, half-way between centres in "
        "longitude (no bounds in the file)");
  const auto window = cf::open_run({write("window.nc", {rows.begin() + 40, rows.begin() + 50})}, "v", notices);
  CHECK(window->grid().gaussian);
  CHECK(window->grid().edges.lat_deg == std::vector<double>(edges.begin() + 40, edges.begin() + 51));
  CHECK(notices.list().empty());
}

TEST_CASE("bounds of a Gaussian grid are kept as they are in the file") {
  Notices notices;
  const auto run = cf::open_run({WINDROW_TESTDATA "/gcm/tas_2005_t63.nc"}, "tas", notices);
  CHECK(run->grid().how == "Gaussian N48, 96 x 192 cells, global, edges from the file's bounds");
  CHECK(run->grid().edges.lon_deg.front() == -0.9375);
  CHECK(run->grid().edges.lat_deg.size() == 97);
}
