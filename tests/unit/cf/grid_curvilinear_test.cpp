// Laws of grids with two-dimensional coordinates: corners stay with their cells whatever the order of dimensions; what
// is missing or repeated is left out and said.
#include <doctest/doctest.h>

#include <cmath>

#include "sample_grid.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

using List = std::vector<double>;

/// A sheared grid: the centre of (y, x) at longitude 10 + 2 x + 0.5 y, latitude 40 + y + 0.1 x.
double centre_lon(double y, double x) { return 10 + 2 * x + 0.5 * y; }
double centre_lat(double y, double x) { return 40 + y + 0.1 * x; }

struct Sheared {
  std::string name = "sheared.nc";
  std::size_t ny = 3, nx = 4;
  std::vector<Length> data = {{"time", 2}, {"y", 3}, {"x", 4}};
  std::vector<Length> flat = {{"y", 3}, {"x", 4}};
  std::vector<Length> corner = {{"y", 3}, {"x", 4}, {"vertex", 4}};
  bool bounds = true;
  nc_type type = NC_DOUBLE;
  std::function<double(double, double)> lon = centre_lon, lat = centre_lat;
  std::function<bool(std::size_t, std::size_t)> missing = [](std::size_t, std::size_t) { return false; };

  [[nodiscard]] std::string write() const {
    FileBuilder file(name);
    with_time(with_dims(file, data).dim("vertex", 4), 2);
    const auto centres = [&](const auto& f) {
      return fill(flat, [&](Index i) { return missing(i["y"], i["x"]) ? 1e20 : f(double(i["y"]), double(i["x"])); });
    };
    const auto corners = [&](const auto& f) {
      return fill(corner, [&](Index i) {  // anticlockwise from the south-west
        const std::size_t k = i["vertex"];
        if (missing(i["y"], i["x"])) return 1e20;
        return f(double(i["y"]) + (k >= 2 ? 0.5 : -0.5), double(i["x"]) + (k == 1 || k == 2 ? 0.5 : -0.5));
      });
    };
    file.var("nav_lat", type, names(flat), centres(lat)).att("units", "degrees_north").att("_FillValue", type, {1e20});
    if (bounds) file.att("bounds", "lat_v");
    file.var("nav_lon", type, names(flat), centres(lon)).att("units", "degrees_east").att("_FillValue", type, {1e20});
    if (bounds) file.att("bounds", "lon_v");
    if (bounds) file.var("lat_v", type, names(corner), corners(lat)).var("lon_v", type, names(corner), corners(lon));
    file.var("v", NC_FLOAT, names(data),
             fill(data, [](Index i) { return 1000 * double(i["time"]) + 10 * double(i["y"]) + double(i["x"]); }));
    file.att("coordinates", "nav_lat nav_lon");
    return file.done();
  }
};

/// Values of cells (y, x) given as 10 y + x, at both steps.
List at_both_steps(const List& cells) {
  List values = cells;
  for (const double cell : cells) values.push_back(1000 + cell);
  return values;
}
List row_by_row(std::size_t ny, std::size_t nx) {
  List cells;
  for (std::size_t y = 0; y < ny; ++y)
    for (std::size_t x = 0; x < nx; ++x) cells.push_back(double(10 * y + x));
  return cells;
}

/// A ring of cells at latitudes 60 + 5 y, 30 degrees wide; column x and column x + 12 are the same place.
Sheared ring(std::size_t columns) {
  Sheared sample;
  sample.nx = columns;
  sample.data = {{"time", 2}, {"y", 3}, {"x", columns}};
  sample.flat = {{"y", 3}, {"x", columns}};
  sample.corner = {{"y", 3}, {"x", columns}, {"vertex", 4}};
  sample.lon = [](double, double x) { return std::fmod(30 * x + 200, 360); };
  sample.lat = [](double y, double) { return 60 + 5 * y; };
  return sample;
}

}  // namespace

TEST_CASE("corners and values are the same in every order of the data's, the centres' and the bounds' dimensions") {
  for (const auto& data : orders(Sheared().data))
    for (const auto& flat : orders(Sheared().flat))
      for (const auto& corner : orders(Sheared().corner)) {
        Sheared sample;
        sample.data = data;
        sample.flat = flat;
        sample.corner = corner;
        const auto run = open(sample.write());
        const cf::Grid& grid = run->grid();
        REQUIRE(grid.kind == cf::GridKind::cells);
        REQUIRE(grid.corners.ny == 3);
        REQUIRE(grid.corners.nx == 4);
        REQUIRE(grid.corners.most == 4);
        std::size_t wrong = 0;
        for (std::size_t cell = 0; cell < 12; ++cell) {
          const double y = double(cell / 4), x = double(cell % 4);
          wrong += grid.corners.centre_lon_deg[cell] != centre_lon(y, x);
          wrong += grid.corners.centre_lat_deg[cell] != centre_lat(y, x);
          wrong += grid.corners.lon_deg[4 * cell] != centre_lon(y - 0.5, x - 0.5);
          wrong += grid.corners.lat_deg[4 * cell + 2] != centre_lat(y + 0.5, x + 0.5);
          wrong += grid.corners.lat_deg[4 * cell + 1] != centre_lat(y - 0.5, x + 0.5);
        }
        CHECK(wrong == 0);
        CHECK(grid.corners.rounding_deg == 1e-9);
        CHECK(read_cells(*run) == at_both_steps(row_by_row(3, 4)));
      }
}

TEST_CASE("how and why name the coordinates, and sides of quadrilaterals may run along parallels") {
  const auto run = open(Sheared().write());
  CHECK(run->grid().sides == mesh::Sides::parallels);
  CHECK(
      run->grid().how ==
      "curvilinear, 3 x 4 cells, corners from the file's bounds 'lat_v', sides along parallels where both ends are at "
      "one latitude");
  CHECK(run->grid().why == "two-dimensional coordinates 'nav_lat' (degrees_north) and 'nav_lon' (degrees_east)");
  cf::GridHints hints;
  hints.sides = "great-circles";
  CHECK(open(Sheared().write(), hints)->grid().sides == mesh::Sides::great_circles);
  Sheared single;
  single.type = NC_FLOAT;
  CHECK(open(single.write())->grid().corners.rounding_deg == 1e-4);
}

TEST_CASE("without bounds corners are inferred, and neighbours share them") {
  Sheared sample;
  sample.bounds = false;
  const auto run = open(sample.write());
  const mesh::CellCorners& corners = run->grid().corners;
  for (std::size_t y = 0; y < 3; ++y)
    for (std::size_t x = 0; x + 1 < 4; ++x) {
      const std::size_t left = 4 * (4 * y + x), right = left + 4;
      CHECK(corners.lon_deg[left + 1] == corners.lon_deg[right]);
      CHECK(corners.lat_deg[left + 2] == corners.lat_deg[right + 3]);
    }
  // The corner between four centres stands in their mean direction.
  double east = 0, north = 0, up = 0;
  for (const double y : {0, 1})
    for (const double x : {0, 1}) {
      const double phi = centre_lat(y, x) * M_PI / 180, lambda = centre_lon(y, x) * M_PI / 180;
      east += std::cos(phi) * std::cos(lambda);
      north += std::cos(phi) * std::sin(lambda);
      up += std::sin(phi);
    }
  CHECK(corners.lat_deg[2] == doctest::Approx(std::atan2(up, std::hypot(east, north)) * 180 / M_PI).epsilon(1e-12));
  CHECK(corners.lon_deg[2] == doctest::Approx(std::atan2(north, east) * 180 / M_PI).epsilon(1e-12));
  CHECK(run->grid().how.starts_with(
      "curvilinear, 3 x 4 cells, corners inferred from the centres (no bounds in the file)"));
}

TEST_CASE("corners that cannot be inferred are asked for") {
  Sheared sample;
  sample.bounds = false;
  sample.lon = [](double y, double x) { return centre_lon(y, x) + (x >= 2 ? 60 : 0); };
  const std::string text = refusal(sample.write());
  CHECK(text.starts_with("sheared.nc: corners cannot be inferred"));
  CHECK(
      text.ends_with("add bounds to the coordinates of 'v', or name a file that has them with grid = { coordinates = "
                     "\"...\" } in the [[run]]"));
}

TEST_CASE("cells without coordinates are left out and said; whole rows leave a structured grid") {
  for (const bool bounds : {true, false}) {
    CAPTURE(bounds);
    Sheared sample;
    sample.bounds = bounds;
    sample.missing = [](std::size_t y, std::size_t x) { return y == 0 && x == 1; };
    Notices notices;
    const auto run = open(sample.write(), notices);
    CHECK(has(notices, "1 cell without coordinates is left out"));
    CHECK(run->grid().corners.ny == 1);
    CHECK(run->grid().corners.nx == 11);
    List cells = row_by_row(3, 4);
    cells.erase(cells.begin() + 1);
    CHECK(read_cells(*run) == at_both_steps(cells));
  }
  Sheared sample;
  sample.missing = [](std::size_t y, std::size_t) { return y == 1; };
  Notices notices;
  const auto run = open(sample.write(), notices);
  CHECK(has(notices, "4 cells without coordinates are left out"));
  CHECK(run->grid().corners.ny == 2);
  CHECK(run->grid().corners.nx == 4);
  CHECK(read_cells(*run) == at_both_steps({0, 1, 2, 3, 20, 21, 22, 23}));
}

TEST_CASE("columns that repeat the first ones a turn later are left out, with and without bounds") {
  for (const bool bounds : {true, false})
    for (const std::size_t extra : {1, 2}) {
      CAPTURE(bounds);
      CAPTURE(extra);
      Sheared sample = ring(12 + extra);
      sample.bounds = bounds;
      Notices notices;
      const auto run = open(sample.write(), notices);
      CHECK(has(notices, bounds ? "repeating an earlier one's centre and corners" : "of 'nav_lat' repeat"));
      CHECK(run->grid().corners.ny == 3);
      CHECK(run->grid().corners.nx == 12);
      CHECK(read_cells(*run) == at_both_steps(row_by_row(3, 12)));
    }
}

TEST_CASE("inferred corners of closed rows meet at the seam, where longitudes jump inside the array too") {
  for (const std::size_t columns : {12, 13}) {
    Sheared sample = ring(columns);
    sample.bounds = false;
    Notices notices;
    const auto run = open(sample.write(), notices);
    const mesh::CellCorners& corners = run->grid().corners;
    REQUIRE(corners.nx == 12);
    CHECK(run->grid().how.find("3 x 12 cells, rows closed") != std::string::npos);
    for (std::size_t y = 0; y < 3; ++y) {
      const std::size_t first = 4 * 12 * y, last = first + 4 * 11;
      CHECK(corners.lon_deg[first] == corners.lon_deg[last + 1]);
      CHECK(corners.lat_deg[first + 3] == corners.lat_deg[last + 2]);
    }
    // All rows are circles of latitude, so every corner between them stands 15 degrees from a centre.
    for (std::size_t k = 0; k < corners.lon_deg.size(); ++k)
      CHECK(std::abs(std::remainder(corners.lon_deg[k] - 200 - 15, 30)) < 1e-9);
  }
}

TEST_CASE("a fold row that repeats the one before it backwards is left out") {
  // The square of u + i v is the same for (u, v) and (-u, -v): a plane folded along v = 0, between rows 1 and 2.
  for (const bool bounds : {true, false}) {
    CAPTURE(bounds);
    Sheared sample = ring(12);
    sample.bounds = bounds;
    sample.lon = [](double y, double x) { return 20 + 0.05 * ((x - 5.5) * (x - 5.5) - (1.5 - y) * (1.5 - y)); };
    sample.lat = [](double y, double x) { return 40 + 0.1 * (x - 5.5) * (1.5 - y); };
    Notices notices;
    const auto run = open(sample.write(), notices);
    CHECK(has(notices, bounds ? "12 cells repeating an earlier one's centre and corners are left out"
                              : "12 cells repeating an earlier one's centre are left out"));
    CHECK(run->grid().corners.ny == 2);
    CHECK(read_cells(*run) == at_both_steps(row_by_row(2, 12)));
  }
}

TEST_CASE("cells whose corners are all in one place are left out and said") {
  Sheared sample;
  sample.lon = [](double y, double x) { return y > 1.4 && x > 2.4 ? 0 : centre_lon(y, x); };
  sample.lat = [](double y, double x) { return y > 1.4 && x > 2.4 ? 0 : centre_lat(y, x); };
  Notices notices;
  const auto run = open(sample.write(), notices);
  CHECK(has(notices, "1 cell without area (fewer than three different corners) is left out"));
  CHECK(run->grid().corners.nx == 11);
}

TEST_CASE("nominal axes give way to two-dimensional coordinates that the variable names, and true ones do not") {
  for (const bool nominal : {true, false}) {
    FileBuilder file("nominal.nc");
    const std::vector<Length> dims = {{"lat", 3}, {"lon", 4}};
    with_dims(file, dims);
    file.var("lat", NC_DOUBLE, {"lat"}, {40, 41, 42}).att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"lon"}, {10, 12, 14, 16}).att("units", "degrees_east");
    const double shear = nominal ? 0.5 : 0;
    file.var("phi", NC_DOUBLE, {"lat", "lon"}, fill(dims, [](Index i) { return 40 + double(i["lat"]); }));
    file.att("units", "degrees_north");
    file.var("lambda", NC_DOUBLE, {"lat", "lon"},
             fill(dims, [&](Index i) { return 10 + 2 * double(i["lon"]) + shear * double(i["lat"]); }));
    file.att("units", "degrees_east");
    file.var("v", NC_FLOAT, {"lat", "lon"}, steps(0, 1, 12)).att("coordinates", "phi lambda");
    Notices notices;
    const auto run = open(file.done(), notices);
    CHECK((run->grid().kind == cf::GridKind::cells) == nominal);
    CHECK(has(notices, "are only nominal") == nominal);
  }
}

TEST_CASE("several coordinates that fit are an error unless the variable names one pair") {
  const auto write = [](bool named) {
    FileBuilder file("several.nc");
    const std::vector<Length> dims = {{"y", 2}, {"x", 2}};
    with_dims(file, dims);
    for (const std::string at : {"t", "u"}) {
      file.var("lat_" + at, NC_DOUBLE, {"y", "x"}, {10, 10, 20, 20}).att("units", "degrees_north");
      file.var("lon_" + at, NC_DOUBLE, {"y", "x"}, {10, 20, 10, 20}).att("units", "degrees_east");
    }
    file.var("v", NC_FLOAT, {"y", "x"}, steps(0, 1, 4));
    if (named) file.att("coordinates", "lat_u lon_u");
    return file.done();
  };
  CHECK(refusal(write(false)).find("its attribute coordinates should name one latitude and one longitude") !=
        std::string::npos);
  CHECK(open(write(true))->grid().why ==
        "two-dimensional coordinates 'lat_u' (degrees_north) and 'lon_u' (degrees_east)");
}

TEST_CASE("coordinates in another file are used as if they were in the data's") {
  Sheared all;
  const List expected = read_cells(*open(all.write()));
  const std::string coordinates = all.write();
  for (const bool renamed : {false, true}) {
    FileBuilder file("bare_data.nc");
    const std::vector<Length> dims = {{"time", 2}, {renamed ? "j" : "y", 3}, {renamed ? "i" : "x", 4}};
    with_time(with_dims(file, dims), 2);
    file.var("v", NC_FLOAT, names(dims), fill(dims, [&](Index i) {
               return 1000 * double(i["time"]) + 10 * double(i[dims[1].name]) + double(i[dims[2].name]);
             }));
    if (!renamed) file.att("coordinates", "nav_lat nav_lon");
    const std::string path = file.done();
    cf::GridHints hints;
    if (!renamed)
      CHECK(refusal(path).find("its coordinates nav_lat, nav_lon are not in the file") != std::string::npos);
    hints.coordinates = coordinates;
    Notices notices;
    const auto run = open(path, notices, hints);
    CHECK(run->grid().corners.lat_deg == open(coordinates)->grid().corners.lat_deg);
    CHECK(read_cells(*run) == expected);
    CHECK(has(notices, "is taken for 'j', which is as long") == renamed);
  }
  Sheared other = ring(12);
  other.name = "other_shape.nc";
  FileBuilder file("bare_data.nc");
  file.dim("y", 3).dim("x", 4).var("v", NC_FLOAT, {"y", "x"}, steps(0, 1, 12));
  cf::GridHints hints;
  hints.coordinates = other.write();
  CHECK(refusal(file.done(), hints) ==
        "other_shape.nc: holds no latitudes and longitudes whose dimensions fit those of variable 'v', (y, x), in "
        "bare_data.nc");
}

TEST_CASE("bounds that fit no cells are said and not used; corners that are no place are errors") {
  Sheared sample;
  sample.lat = [](double y, double x) { return centre_lat(y, x) + (y < -0.4 ? 400 : 0); };
  CHECK(refusal(sample.write()).find("is no place on the globe") != std::string::npos);
  sample.lat = [](double, double) { return 91; };
  CHECK(refusal(sample.write()) == "sheared.nc: coordinate 'nav_lat': 91 degrees at position 0 is no latitude");
}

TEST_CASE("files of a run on different cells are refused") {
  Sheared a, b;
  b.name = "b.nc";
  b.lat = [](double y, double x) { return centre_lat(y, x) + 0.01; };
  Notices notices;
  const std::string first = a.write();
  CHECK(error_text(Failure::data, [&] {
          cf::open_run({first, b.write()}, "v", notices);
        }).starts_with("b.nc: the grid is another (curvilinear, 3 x 4 cells"));
}

TEST_CASE("a real file whose coordinates are transposed against the data is read in the data's order") {
  Notices notices;
  const auto run = cf::open_run({WINDROW_TESTDATA "/cf/small_latlon_transposed_vs_data.nc"},
                                "Total_precipitation_surface_1_Hour_Accumulation", notices);
  CHECK(run->grid().corners.ny == 118);
  CHECK(run->grid().corners.nx == 87);
  // lat(x, y) and lon(x, y) at (1, 2), as the file's own values print.
  CHECK(run->grid().corners.centre_lat_deg[2 * 87 + 1] == doctest::Approx(33.83146).epsilon(1e-7));
  CHECK(run->grid().corners.centre_lon_deg[2 * 87 + 1] == doctest::Approx(-80.53659).epsilon(1e-7));
}
