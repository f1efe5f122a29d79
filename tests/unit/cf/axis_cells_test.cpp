// Laws of cells made from one axis: edges ascend and are shared, the globe closes, what is repaired is said.
#include "cf/axis_cells.h"

#include <doctest/doctest.h>

#include <cmath>

#include "file_builder.h"
#include "windrow/mesh/mesh.h"

using namespace windrow;
using namespace windrow::cf;
using namespace windrow::cftest;

namespace {

using List = std::vector<double>;

AxisValues axis(List centres, List bounds = {}, bool single_precision = false) {
  if (single_precision)
    for (double& centre : centres) centre = double(float(centre));
  return {"FILE", "axis", std::move(centres), std::move(bounds), "axis_bnds", single_precision};
}

std::string latitude_error(const AxisValues& values) {
  return error_text(Failure::data, [&] {
    Remarks remarks;
    latitude_cells(values, remarks);
  });
}
std::string longitude_error(const AxisValues& values) {
  return error_text(Failure::data, [&] {
    Remarks remarks;
    longitude_cells(values, remarks);
  });
}

/// Cells that need no remark.
AxisCells latitude(const AxisValues& values) {
  Remarks remarks;
  AxisCells cells = latitude_cells(values, remarks);
  CHECK(remarks == Remarks{});
  return cells;
}
AxisCells longitude(const AxisValues& values) {
  Remarks remarks;
  AxisCells cells = longitude_cells(values, remarks);
  CHECK(remarks == Remarks{});
  return cells;
}

List pairs(const List& edges) {
  List bounds;
  for (std::size_t i = 0; i + 1 < edges.size(); ++i) {
    bounds.push_back(edges[i]);
    bounds.push_back(edges[i + 1]);
  }
  return bounds;
}

}  // namespace

TEST_CASE("latitudes may run either way; cells ascend and index leads back into the array") {
  const AxisCells up = latitude(axis({-5, 5, 15})), down = latitude(axis({15, 5, -5}));
  CHECK(up.edges == List{-10, 0, 10, 20});
  CHECK(down.edges == up.edges);
  CHECK(up.index == std::vector<std::size_t>{0, 1, 2});
  CHECK(down.index == std::vector<std::size_t>{2, 1, 0});
  CHECK(up.step == 10);
}

TEST_CASE("cells centred at the poles are half cells") {
  const AxisCells cells = latitude(axis(steps(-90, 2, 91)));
  CHECK(cells.edges.front() == -90);
  CHECK(cells.edges[1] == -89);
  CHECK(cells.edges[90] == 89);
  CHECK(cells.edges.back() == 90);
}

TEST_CASE("bounds decide where they exist, irregular or not, and end at the poles") {
  const List edges = {-90, -60, -20, 10, 90};
  const AxisCells cells = latitude(axis({-70, -30, 0, 50}, pairs(edges)));
  CHECK(cells.edges == edges);
  CHECK(cells.from_bounds);
  CHECK(cells.step == 0);
}

TEST_CASE("global longitudes span exactly 360 degrees in every usual form, with or without bounds") {
  for (const double first : {0.0, 0.5, -180.0, -179.5, -0.25}) {
    CAPTURE(first);
    const List centres = steps(first, 1, 360);
    const AxisCells plain = longitude(axis(centres)),
                    bounded = longitude(axis(centres, pairs(steps(first - 0.5, 1, 361))));
    CHECK(plain.edges.back() - plain.edges.front() == 360);
    CHECK(plain.edges == bounded.edges);
    CHECK(plain.edges.front() == first - 0.5);
  }
}

TEST_CASE("float32 coordinates of a decimal grid give correctly rounded decimal edges and exactly 360 degrees") {
  struct Case {
    double first, step;
    std::size_t count;
  };
  for (const Case& c : {Case{0.05, 0.1, 3600}, Case{-179.95, 0.1, 3600}, Case{0.125, 0.25, 1440},
                        Case{-180 + 1.0 / 6, 1.0 / 3, 1080}, Case{0, 1.875, 192}, Case{0, 360.0 / 7, 7}}) {
    CAPTURE(c.step);
    const AxisCells cells = longitude(axis(steps(c.first, c.step, c.count), {}, true));
    REQUIRE(cells.edges.size() == c.count + 1);
    CHECK(cells.edges.back() - cells.edges.front() == 360);
    // Twelfths of 0.1 are whole numbers here, so the exact edge is a ratio of whole numbers: one rounding.
    const double n = double(c.count), quarter = std::round(c.first * n / 90);
    std::size_t wrong = 0;
    for (std::size_t i = 0; i <= c.count; ++i) wrong += cells.edges[i] != (quarter - 2 + 4 * double(i)) * 90 / n;
    CHECK(wrong == 0);
  }
}

TEST_CASE("double and float32 files of one grid have the same edges bit for bit") {
  const List centres = steps(-89.95, 0.1, 1800);
  List exact;
  for (int i = 0; i < 1800; ++i) exact.push_back((-8995 + 10 * i) / 100.0);
  CHECK(latitude(axis(centres, {}, true)).edges == latitude(axis(exact)).edges);
  CHECK(latitude(axis(exact)).edges[1] == -89.9);
}

TEST_CASE("float-rounded bounds of neighbours become one edge") {
  List bounds = pairs(steps(0, 0.1, 3601));
  for (double& b : bounds) b = double(float(b));
  for (std::size_t i = 2; i < bounds.size(); i += 2) bounds[i] = std::nextafter(float(bounds[i]), 1e9F);
  const AxisCells cells = longitude(axis(steps(0.05, 0.1, 3600), bounds, true));
  CHECK(cells.edges.back() - cells.edges.front() == 360);
  CHECK(cells.edges[3] == 0.3);
}

TEST_CASE("longitudes that jump by a turn inside the array are followed round") {
  const AxisCells cells = longitude(axis({357.5, 358.5, 359.5, 0.5, 1.5}));
  CHECK(cells.edges == List{-3, -2, -1, 0, 1, 2});
  CHECK(cells.index == std::vector<std::size_t>{0, 1, 2, 3, 4});
  const AxisCells dateline = longitude(axis({178.5, 179.5, -179.5, -178.5}));
  CHECK(dateline.edges == List{178, 179, 180, 181, 182});
  const AxisCells down = longitude(axis({1.5, 0.5, 359.5, 358.5}));
  CHECK(down.edges == List{-2, -1, 0, 1, 2});
  CHECK(down.index == std::vector<std::size_t>{3, 2, 1, 0});
}

TEST_CASE("a window cut across the end of the array is turned into one piece and reported") {
  Remarks remarks;
  const AxisCells cells = longitude_cells(axis({0.5, 1.5, 2.5, 356.5, 357.5, 358.5, 359.5}), remarks);
  CHECK(cells.edges == List{-4, -3, -2, -1, 0, 1, 2, 3});
  CHECK(cells.index == std::vector<std::size_t>{3, 4, 5, 6, 0, 1, 2});
  CHECK(remarks == Remarks{"'axis' crosses the end of its array; columns from position 3 on come first"});
}

TEST_CASE("a repeated wrap column is dropped and reported") {
  Remarks remarks;
  const AxisCells cells = longitude_cells(axis(steps(0, 2, 181), {}, true), remarks);
  CHECK(cells.index.size() == 180);
  CHECK(cells.edges.front() == -1);
  CHECK(cells.edges.back() == 359);
  CHECK(remarks == Remarks{"1 longitude column of 'axis' repeats the first a full turn later and is dropped"});
  remarks.clear();
  CHECK(longitude_cells(axis(steps(-180, 10, 39)), remarks).index.size() == 36);
  CHECK(remarks == Remarks{"3 longitude columns of 'axis' repeat the first a full turn later and are dropped"});
}

TEST_CASE("half cells at both ends of a bounded circle are kept") {
  const AxisCells cells = longitude(axis({0, 90, 180, 270, 360}, {0, 45, 45, 135, 135, 225, 225, 315, 315, 360}));
  CHECK(cells.edges == List{0, 45, 135, 225, 315, 360});
}

TEST_CASE("irregular global longitudes close with a half-way edge at the seam") {
  const AxisCells cells = longitude(axis({0, 70, 150, 220, 300}));
  CHECK(cells.edges == List{-30, 35, 110, 185, 260, 330});
}

TEST_CASE("descending longitudes are turned round") {
  const AxisCells cells = longitude(axis({30, 20, 10}, {35, 25, 25, 15, 15, 5}));
  CHECK(cells.edges == List{5, 15, 25, 35});
  CHECK(cells.index == std::vector<std::size_t>{2, 1, 0});
}

TEST_CASE("bounds in another turn than their centre follow it") {
  CHECK(longitude(axis({0, 1, 2}, {359.5, 0.5, 0.5, 1.5, 1.5, 2.5})).edges == List{-0.5, 0.5, 1.5, 2.5});
  CHECK(longitude(axis({190, 200}, {-175, -165, -165, -155})).edges == List{185, 195, 205});
  CHECK(longitude(axis({180}, {0, 360})).edges == List{0, 360});
}

TEST_CASE("pairs of bounds against the coordinate's order are put in order and reported") {
  Remarks remarks;
  CHECK(latitude_cells(axis({25, 15, 5}, {20, 30, 10, 20, 0, 10}), remarks).edges == List{0, 10, 20, 30});
  CHECK(remarks == Remarks{"3 of 3 pairs of bounds in 'axis_bnds' are ordered against the coordinate; they are put in "
                           "order"});
}

TEST_CASE("bounds without width are not used, bounds beyond the pole end there; both are reported") {
  Remarks remarks;
  CHECK(latitude_cells(axis({5, 15}, {5, 5, 15, 15}), remarks).edges == List{0, 10, 20});
  CHECK(remarks == Remarks{"bounds 'axis_bnds' have no width and are not used"});
  remarks.clear();
  CHECK(latitude_cells(axis({80, 90}, {75, 85, 85, 95}), remarks).edges == List{75, 85, 90});
  CHECK(remarks == Remarks{"bounds 'axis_bnds' reach 95 degrees; the edge is set to the pole"});
}

TEST_CASE("inconsistent axes are errors that name the place") {
  CHECK(latitude_error(axis({0, 10, 5})) ==
        "FILE: coordinate 'axis': not monotonic: 10 and 5 stand side by side (positions 1 and 2)");
  CHECK(latitude_error(axis({5})) ==
        "FILE: coordinate 'axis': a single value (5) without bounds, so the extent of its "
        "cell is not known");
  CHECK(latitude_error(axis({80, 90, 100})) == "FILE: coordinate 'axis': latitude 100 lies beyond the pole");
  CHECK(latitude_error(axis({5, 15}, {0, 10, 11, 20})) ==
        "FILE: coordinate 'axis': bounds 'axis_bnds' leave a gap between 10 and 11 degrees (positions 0 and 1)");
  CHECK(latitude_error(axis({5, 15}, {0, 10, 9, 20})) ==
        "FILE: coordinate 'axis': bounds 'axis_bnds' overlap between 9 and 10 degrees (positions 0 and 1)");
  CHECK(latitude_error(axis({5, 15}, {0, 10, 16, 20})) ==
        "FILE: coordinate 'axis': bounds 'axis_bnds' of position 1 are 16 .. 20 and do not hold the centre 15");
  CHECK(longitude_error(axis({0, 10, 20, 30, 60, 70, 80})) ==
        "FILE: coordinate 'axis': gap between 30 and 60 degrees while the other cells are 10 degrees apart; a grid "
        "without gaps is needed");
  CHECK(longitude_error(axis({0, 350, 10, 340, 20})).find("not monotonic") == std::string::npos);
  CHECK(longitude_error(axis({100, 200, 300}, {0, 150, 150, 250, 250, 370})) ==
        "FILE: coordinate 'axis': its cells span 370 degrees, more than the globe");
}

TEST_CASE("every pair of neighbouring cells shares its edge and every centre lies in its cell, whatever the spacing") {
  // Pinned seed; spacings over three orders of magnitude.
  std::uint64_t state = 20240229;
  const auto random = [&] {
    state = state * 6364136223846793005ULL + 1442695040888963407ULL;
    return double(state >> 11) * 0x1p-53;
  };
  for (int round = 0; round < 200; ++round) {
    List centres = {-180 * random()};
    while (centres.size() < 40) centres.push_back(centres.back() + std::pow(10, 0.9 - 3 * random()));
    Remarks remarks;
    AxisCells cells;
    try {
      cells = longitude_cells(axis(centres), remarks);
    } catch (const Error&) {
      continue;  // spacings that span more than the globe, or look like a gap
    }
    for (std::size_t i = 0; i < cells.index.size(); ++i) {
      const double centre = centres[cells.index[i]];
      REQUIRE(cells.edges[i] < cells.edges[i + 1]);
      const bool inside = cells.edges[i] < centre && centre < cells.edges[i + 1];
      REQUIRE(inside);
    }
  }
}
