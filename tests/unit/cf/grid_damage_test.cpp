// Law of damaged metadata: whatever bytes change in a file's header or coordinates, opening and reading it gives values
// or an Error, never anything else.
#include <doctest/doctest.h>

#include "sample_grid.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

using List = std::vector<double>;

std::uint64_t state = 1913;  // pinned seed
std::size_t below(std::size_t n) {
  state = state * 6364136223846793005ULL + 1442695040888963407ULL;
  return std::size_t((state >> 33) % n);
}

std::string ugrid() {
  FileBuilder file("a.nc");
  file.dim("node", 4).dim("face", 2).dim("most", 3);
  file.var("m", NC_INT, {}, {}).att("cf_role", "mesh_topology").att("topology_dimension", NC_INT, {2});
  file.att("node_coordinates", "x y").att("face_node_connectivity", "links");
  file.var("x", NC_DOUBLE, {"node"}, {0, 1, 1, 0}).att("units", "degrees_east");
  file.var("y", NC_DOUBLE, {"node"}, {0, 0, 1, 1}).att("units", "degrees_north");
  file.var("links", NC_INT, {"face", "most"}, {1, 2, 3, 1, 3, 4}).att("start_index", NC_INT, {1});
  file.var("v", NC_FLOAT, {"face"}, {1, 2}).att("mesh", "m").att("location", "face");
  return file.done();
}

std::string healpix() {
  FileBuilder file("b.nc");
  file.dim("cell", 3);
  file.var("hp", NC_INT, {}, {}).att("grid_mapping_name", "healpix").att("indexing_scheme", "nested_unique");
  file.var("where", NC_INT, {"cell"}, {15, 21, 164}).att("standard_name", "healpix_index");
  file.var("v", NC_FLOAT, {"cell"}, {1, 2, 3}).att("grid_mapping", "hp");
  return file.done();
}

std::string gathered() {
  FileBuilder file("c.nc");
  file.dim("lat", 3).dim("lon", 4).dim("land", 3);
  file.var("lat", NC_DOUBLE, {"lat"}, {10, 20, 30}).att("units", "degrees_north");
  file.var("lon", NC_DOUBLE, {"lon"}, {10, 20, 30, 40}).att("units", "degrees_east");
  file.var("land", NC_INT, {"land"}, {0, 5, 11}).att("compress", "lat lon");
  file.var("v", NC_FLOAT, {"land"}, {7, 8, 9});
  return file.done();
}

std::string curvilinear(bool bounds) {
  FileBuilder file(bounds ? "d.nc" : "e.nc");
  const std::vector<Length> dims = {{"y", 3}, {"x", 9}}, corners = {{"y", 3}, {"x", 9}, {"n", 4}};
  with_dims(file, corners);
  for (const bool lat : {true, false}) {
    const auto value = [&](double y, double x) { return lat ? 60 + y : 40 * x + y; };
    file.var(lat ? "lat" : "lon", NC_DOUBLE, names(dims),
             fill(dims, [&](Index i) { return value(double(i["y"]), double(i["x"])); }));
    file.att("units", lat ? "degrees_north" : "degrees_east");
    if (!bounds) continue;
    file.att("bounds", lat ? "lat_b" : "lon_b");
    file.var(lat ? "lat_b" : "lon_b", NC_DOUBLE, names(corners), fill(corners, [&](Index i) {
               return value(double(i["y"]) + (i["n"] >= 2 ? 0.5 : -0.5),
                            double(i["x"]) + (i["n"] == 1 || i["n"] == 2 ? 0.5 : -0.5));
             }));
  }
  file.var("v", NC_FLOAT, names(dims), steps(0, 1, 27)).att("coordinates", "lat lon");
  return file.done();
}

std::string reduced() {
  FileBuilder file("f.nc");
  List lat, lon;
  for (std::size_t row = 0; row < 4; ++row)
    for (std::size_t i = 0; i < 4; ++i) {
      lat.push_back(double(row) * 45 - 67.5);
      lon.push_back(double(i) * 90);
    }
  file.dim("p", 16);
  file.var("lat", NC_DOUBLE, {"p"}, lat).att("units", "degrees_north");
  file.var("lon", NC_DOUBLE, {"p"}, lon).att("units", "degrees_east");
  file.var("v", NC_FLOAT, {"p"}, steps(0, 1, 16));
  return file.done();
}

std::string plane(bool rotated) {
  FileBuilder file(rotated ? "g.nc" : "h.nc");
  file.dim("y", 3).dim("x", 4);
  file.var("y", NC_DOUBLE, {"y"}, {1, 2, 3})
      .att("standard_name", rotated ? "grid_latitude" : "projection_y_coordinate");
  file.att("units", rotated ? "degrees" : "km");
  file.var("x", NC_DOUBLE, {"x"}, {1, 2, 3, 4});
  file.att("standard_name", rotated ? "grid_longitude" : "projection_x_coordinate");
  file.att("units", rotated ? "degrees" : "km");
  file.var("crs", NC_INT, {}, {});
  file.att("grid_mapping_name", rotated ? "rotated_latitude_longitude" : "mercator");
  file.att("grid_north_pole_longitude", NC_DOUBLE, {10}).att("grid_north_pole_latitude", NC_DOUBLE, {50});
  file.var("v", NC_FLOAT, {"y", "x"}, steps(0, 1, 12)).att("grid_mapping", "crs");
  return file.done();
}

}  // namespace

TEST_CASE("a file with changed bytes is read or refused with an Error, whatever its grid") {
  std::size_t read = 0, refused = 0;
  for (const std::string& path :
       {ugrid(), healpix(), gathered(), curvilinear(true), curvilinear(false), reduced(), plane(true), plane(false)}) {
    const std::string whole = text_of_file(path);
    Notices untouched;
    CHECK(read_cells(*open(path, untouched)).size() > 0);
    for (int round = 0; round < 250; ++round) {
      std::string bytes = whole;
      for (std::size_t n = 1 + below(3); n > 0; --n) {
        const std::size_t at = 4 + below(bytes.size() - 4);
        bytes[at] = below(2) > 0 ? char(below(256)) : bytes[4 + below(bytes.size() - 4)];
      }
      const std::string damaged = write_file("damaged.nc", bytes);
      Notices notices;
      try {
        const auto run = cf::open_run({damaged}, "v", notices);
        std::vector<std::uint32_t> cells(std::min<std::size_t>(cell_count(run->grid()), 100));
        std::iota(cells.begin(), cells.end(), 0);
        std::vector<double> values(cells.size());
        run->read(0, 1, cells, values.data());
        ++read;
      } catch (const Error& error) {
        CHECK(error.kind() != Failure::defect);
        ++refused;
      }
    }
  }
  CHECK(read > 0);
  CHECK(refused > 0);
}
