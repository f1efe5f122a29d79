// Laws of UGRID faces and HEALPix cells: numbers in the file become records, and every number out of range an error.
#include <doctest/doctest.h>

#include "sample_grid.h"
#include "windrow/mesh/mesh.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

using List = std::vector<double>;
constexpr double kFill = -999;

/// Two triangles and a quadrilateral on six nodes.
struct Ugrid {
  double start = 0;
  bool attribute = true, transposed = false, time_first = true;
  std::string location = "face";
  double none = kFill;
  List nodes = {0, 1, 2, kFill, 0, 2, 3, kFill, 1, 4, 5, 2};

  [[nodiscard]] std::string write() const {
    FileBuilder file("ugrid.nc");
    file.dim("time", 2).dim("node", 6).dim("face", 3).dim("most", 4);
    with_time(file, 2);
    file.var("topology", NC_INT, {}, {}).att("cf_role", "mesh_topology").att("topology_dimension", NC_INT, {2});
    file.att("node_coordinates", "node_x node_y").att("face_node_connectivity", "links");
    if (transposed) file.att("face_dimension", "face");
    file.var("node_x", NC_DOUBLE, {"node"}, {0, 1, 1, 0, 2, 2}).att("standard_name", "longitude");
    file.att("units", "degrees_east");
    file.var("node_y", NC_DOUBLE, {"node"}, {0, 0, 1, 1, 0, 1}).att("standard_name", "latitude");
    file.att("units", "degrees_north");
    List links;
    for (std::size_t i = 0; i < 12; ++i) {
      const double node = nodes[transposed ? i % 3 * 4 + i / 3 : i];
      links.push_back(node == kFill ? none : node + start);
    }
    std::vector<std::string> dims = {"face", "most"};
    if (transposed) std::swap(dims[0], dims[1]);
    file.var("links", NC_INT, dims, links).att("cf_role", "face_node_connectivity");
    if (none == kFill) file.att("_FillValue", NC_INT, {kFill});
    if (attribute) file.att("start_index", NC_INT, {start});
    std::vector<Length> order = {{"time", 2}, {"face", 3}};
    if (!time_first) std::swap(order[0], order[1]);
    file.var("v", NC_FLOAT, names(order),
             fill(order, [](Index i) { return 10 * double(i["time"]) + double(i["face"]); }));
    file.att("mesh", "topology").att("location", location);
    return file.done();
  }
};

struct Healpix {
  std::size_t cells = 12;
  std::string scheme = "nested";
  double level = 0;
  List index;
  nc_type type = NC_INT64;
  bool time_first = true;

  [[nodiscard]] std::string write() const {
    FileBuilder file("healpix.nc", NC_NETCDF4);
    file.dim("time", 2).dim("cell", cells);
    with_time(file, 2);
    file.var("hp", NC_INT, {}, {}).att("grid_mapping_name", "healpix").att("indexing_scheme", scheme);
    if (level >= 0) file.att("refinement_level", NC_INT, {level});
    if (!index.empty()) file.var("where", type, {"cell"}, index).att("standard_name", "healpix_index");
    std::vector<Length> order = {{"time", 2}, {"cell", cells}};
    if (!time_first) std::swap(order[0], order[1]);
    file.var("v", NC_FLOAT, names(order),
             fill(order, [](Index i) { return 1000 * double(i["time"]) + double(i["cell"]); }));
    file.att("grid_mapping", "hp");
    return file.done();
  }
};

}  // namespace

TEST_CASE("UGRID faces are the same record from 0 or 1, with either fill, transposed or not") {
  for (const double start : {0, 1})
    for (const bool transposed : {false, true})
      for (const double none : {kFill, -1.0, 1e6})
        for (const bool time_first : {true, false}) {
          Ugrid sample;
          sample.start = start;
          sample.transposed = transposed;
          sample.none = none;
          sample.time_first = time_first;
          const auto run = open(sample.write());
          const cf::Grid& grid = run->grid();
          REQUIRE(grid.kind == cf::GridKind::faces);
          CHECK(grid.faces.most == 4);
          CHECK(grid.faces.nodes == std::vector<std::int64_t>{0, 1, 2, -1, 0, 2, 3, -1, 1, 4, 5, 2});
          CHECK(grid.faces.lon_deg == List{0, 1, 1, 0, 2, 2});
          CHECK(grid.faces.lat_deg == List{0, 0, 1, 1, 0, 1});
          CHECK(read_cells(*run) == List{0, 1, 2, 10, 11, 12});
        }
  CHECK(open(Ugrid().write())->grid().how == "UGRID, 3 faces of up to 4 nodes, 6 nodes, sides along great circles");
  CHECK(open(Ugrid().write())->grid().why == "mesh 'topology' with face_node_connectivity 'links', location face");
}

TEST_CASE("a mesh in another file serves as one in the data's") {
  const std::string mesh = Ugrid().write();
  FileBuilder file("on_mesh.nc");
  file.dim("face", 3).var("v", NC_FLOAT, {"face"}, {7, 8, 9}).att("mesh", "topology").att("location", "face");
  const std::string path = file.done();
  CHECK(refusal(path) == "on_mesh.nc: variable 'v': its mesh 'topology' is not in the file");
  cf::GridHints hints;
  hints.coordinates = mesh;
  const auto run = open(path, hints);
  CHECK(run->grid().faces.nodes == open(mesh)->grid().faces.nodes);
  CHECK(read_cells(*run) == List{7, 8, 9});
}

TEST_CASE("data at nodes or edges, and connectivity that is none, are refused") {
  Ugrid sample;
  sample.location = "node";
  CHECK(refusal(sample.write()) ==
        "ugrid.nc: variable 'v': at the nodes of mesh 'topology'; only data at faces have an area and can be read");
  sample = {};
  sample.start = 1;
  sample.attribute = false;
  CHECK(refusal(sample.write()) ==
        "ugrid.nc: variable 'v': face 2 of 'links' (counted from 0) names node 6, but nodes are numbered 0 to 5 "
        "(start_index 0)");
  sample = {};
  sample.nodes[1] = kFill;
  CHECK(refusal(sample.write()) ==
        "ugrid.nc: variable 'v': face 0 of 'links' (counted from 0) has a missing node before others");
  sample = {};
  sample.nodes[2] = kFill;
  CHECK(refusal(sample.write()) ==
        "ugrid.nc: variable 'v': face 0 of 'links' (counted from 0) has 2 nodes; at least 3 were expected");
}

TEST_CASE("HEALPix cells without an index are all cells in order, ring numbers become nested ones") {
  Healpix sample;
  sample.level = 1;
  sample.cells = 48;
  for (const std::string scheme : {"nested", "ring"})
    for (const bool time_first : {true, false}) {
      sample.scheme = scheme;
      sample.time_first = time_first;
      const auto run = open(sample.write());
      const cf::Grid& grid = run->grid();
      REQUIRE(grid.kind == cf::GridKind::healpix);
      REQUIRE(grid.healpix.size() == 48);
      for (std::uint64_t i = 0; i < 48; ++i)
        CHECK(grid.healpix[i] == (scheme == "ring" ? mesh::healpix_from_ring(1, i, "test") : mesh::HealpixCell{1, i}));
      List expected = steps(0, 1, 48);
      for (const double value : steps(1000, 1, 48)) expected.push_back(value);
      CHECK(read_cells(*run) == expected);
      CHECK(grid.how == "HEALPix, 48 cells of level 1, all of the globe");
    }
}

TEST_CASE("HEALPix indices of every scheme are read exactly, of mixed levels too") {
  Healpix sample;
  sample.cells = 3;
  sample.level = 2;
  sample.index = {191, 0, 7};
  CHECK(open(sample.write())->grid().healpix == std::vector<mesh::HealpixCell>{{2, 191}, {2, 0}, {2, 7}});
  sample.level = -1;
  sample.scheme = "nested_unique";  // nested + 4^(1 + level): CF 1.13 appendix F, "HEALPix"
  sample.index = {4 + 11, 16 + 5, 64 + 100};
  CHECK(open(sample.write())->grid().healpix == std::vector<mesh::HealpixCell>{{0, 11}, {1, 5}, {2, 100}});
  CHECK(open(sample.write())->grid().how == "HEALPix, 3 cells of level 0 to 2, part of the globe");
  sample.scheme = "zuniq";  // (2 nested + 1) 4^(29 - level), ibid.
  sample.index = {23 * 0x1p58, 11 * 0x1p56, 201 * 0x1p54};
  CHECK(open(sample.write())->grid().healpix == std::vector<mesh::HealpixCell>{{0, 11}, {1, 5}, {2, 100}});
}

TEST_CASE("HEALPix numbers out of range, unknown schemes and lengths that are not all cells are errors") {
  Healpix sample;
  sample.cells = 11;
  CHECK(refusal(sample.write()) ==
        "healpix.nc: variable 'v': on a HEALPix grid of level 0 without healpix_index, but no dimension has the length "
        "12 of all its cells");
  sample.index = steps(2, 1, 11);
  CHECK(refusal(sample.write()) ==
        "healpix.nc: 'where' is 12 at position 10, but cells of level 0 are numbered 0 to 11");
  sample.type = NC_DOUBLE;
  CHECK(refusal(sample.write()) == "healpix.nc: variable 'where' holds double values, integers were expected");
  sample.level = 30;
  CHECK(refusal(sample.write()) ==
        "healpix.nc: variable 'v': refinement_level of grid mapping 'hp' is 30; 0 to 29 was expected");
  sample.scheme = "spiral";
  CHECK(refusal(sample.write()) ==
        "healpix.nc: variable 'v': grid mapping 'hp' has the indexing_scheme 'spiral'; nested, ring, nested_unique or "
        "zuniq was expected");
}

TEST_CASE("a HEALPix cell that stands twice is left out and said") {
  Healpix sample;
  sample.cells = 3;
  sample.index = {3, 3, 5};
  Notices notices;
  const auto run = open(sample.write(), notices);
  CHECK(has(notices, "1 cell repeating an earlier one is left out"));
  CHECK(read_cells(*run) == List{0, 2, 1000, 1002});
}
