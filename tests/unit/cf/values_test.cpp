// Laws of missing and packed data: missing is judged on the stored number, values are exact in double.
#include <doctest/doctest.h>

#include <cmath>
#include <limits>

#include "sample_run.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

/// One row of cells that holds `stored`; `more` adds attributes.
struct Row {
  std::vector<double> values;
  std::vector<float> floats;
  std::vector<std::string> notices;
  bool double_precision = false;
};
Row read_row(nc_type type, const std::vector<double>& stored, const std::function<void(FileBuilder&)>& more,
             int mode = 0) {
  FileBuilder file("row.nc", mode);
  file.dim("lat", 2).dim("lon", stored.size());
  file.var("lat", NC_DOUBLE, {"lat"}, {10, 20}).att("units", "degrees_north");
  file.var("lon", NC_DOUBLE, {"lon"}, steps(0, 10, stored.size())).att("units", "degrees_east");
  std::vector<double> both = stored;
  both.insert(both.end(), stored.begin(), stored.end());
  file.var("v", type, {"lat", "lon"}, both);
  more(file);
  Notices notices;
  const auto run = cf::open_run({file.done()}, "v", notices);
  Row row;
  row.values.resize(stored.size());
  row.floats.resize(stored.size());
  std::vector<std::uint32_t> cells(stored.size());
  std::iota(cells.begin(), cells.end(), 0);
  run->read(0, 1, cells, row.values.data());
  run->read(0, 1, cells, row.floats.data());
  row.notices = texts(notices);
  row.double_precision = run->double_precision();
  return row;
}

void check_equal(const std::vector<double>& values, const std::vector<double>& expected) {
  REQUIRE(values.size() == expected.size());
  for (std::size_t i = 0; i < values.size(); ++i) {
    CAPTURE(i);
    const bool same = std::isnan(expected[i]) ? std::isnan(values[i]) : values[i] == expected[i];
    CHECK(same);
  }
}

}  // namespace

TEST_CASE("missing is judged on packed numbers, before scaling") {
  // 32 packed is 0 unpacked; a missing_value of 0 must take the packed 0 (-64 unpacked) only.
  const Row row = read_row(NC_SHORT, {0, 32, -32767, 100}, [](FileBuilder& f) {
    f.att("scale_factor", NC_DOUBLE, {2}).att("add_offset", NC_DOUBLE, {-64});
    f.att("_FillValue", NC_SHORT, {-32767}).att("missing_value", NC_SHORT, {0});
  });
  check_equal(row.values, {kNaN, 0, kNaN, 136});
  CHECK(row.notices.empty());
}

TEST_CASE("unpacking is packed * scale + offset in double; a float packing is then rounded to float") {
  const double scale = 0.000270934372177591, offset = 4.15255160556782;
  const std::vector<double> stored = {-32766, -1, 0, 1, 12345, 32766};
  const Row exact = read_row(NC_SHORT, stored, [&](FileBuilder& f) {
    f.att("scale_factor", NC_DOUBLE, {scale}).att("add_offset", NC_DOUBLE, {offset});
  });
  CHECK(exact.double_precision);
  const Row rounded = read_row(NC_SHORT, stored, [&](FileBuilder& f) {
    f.att("scale_factor", NC_FLOAT, {scale}).att("add_offset", NC_FLOAT, {offset});
  });
  CHECK_FALSE(rounded.double_precision);
  for (std::size_t i = 0; i < stored.size(); ++i) {
    CHECK(exact.values[i] == stored[i] * scale + offset);
    CHECK(exact.floats[i] == float(stored[i] * scale + offset));
    const double expected = double(float(stored[i] * double(float(scale)) + double(float(offset))));
    CHECK(rounded.values[i] == expected);
    CHECK(double(rounded.floats[i]) == expected);
  }
}

TEST_CASE("packing of two types is unpacked in double and reported; a packing by 1 and 0 is none") {
  const Row mixed = read_row(NC_SHORT, {1, 2}, [](FileBuilder& f) {
    f.att("scale_factor", NC_FLOAT, {0.5}).att("add_offset", NC_DOUBLE, {0.1});
  });
  check_equal(mixed.values, {1 * 0.5 + 0.1, 2 * 0.5 + 0.1});
  CHECK(mixed.notices ==
        std::vector<std::string>{
            "variable 'v': scale_factor is float and add_offset double; values are unpacked in double"});
  const Row none = read_row(NC_FLOAT, {0.1, 2}, [](FileBuilder& f) {
    f.att("scale_factor", NC_DOUBLE, {1}).att("add_offset", NC_DOUBLE, {0});
  });
  CHECK_FALSE(none.double_precision);
  CHECK(none.values[0] == double(0.1F));
}

TEST_CASE("missing_value may be a list; NaN and the default fill are missing; one-byte data have no default fill") {
  check_equal(read_row(NC_FLOAT, {1, -99, -999, kNaN, 5},
                       [](FileBuilder& f) {
                         f.att("missing_value", NC_FLOAT, {-99, -999});
                       })
                  .values,
              {1, kNaN, kNaN, kNaN, 5});
  check_equal(read_row(NC_FLOAT, {1, NC_FILL_FLOAT}, [](FileBuilder&) {}).values, {1, kNaN});
  check_equal(read_row(NC_DOUBLE, {1, NC_FILL_DOUBLE}, [](FileBuilder&) {}).values, {1, kNaN});
  check_equal(read_row(NC_BYTE, {1, NC_FILL_BYTE}, [](FileBuilder&) {}).values, {1, NC_FILL_BYTE});
  check_equal(read_row(NC_FLOAT, {1, kNaN}, [](FileBuilder& f) { f.att("_FillValue", NC_FLOAT, {kNaN}); }).values,
              {1, kNaN});
}

TEST_CASE("values outside valid_range, valid_min and valid_max are missing, on packed numbers where given packed") {
  check_equal(read_row(NC_FLOAT, {-2, -1.8, 35, 36},
                       [](FileBuilder& f) {
                         f.att("valid_range", NC_FLOAT, {-1.8, 35});
                       })
                  .values,
              {kNaN, double(-1.8F), 35, kNaN});
  check_equal(read_row(NC_FLOAT, {-2, 0, 4}, [](FileBuilder& f) { f.att("valid_min", NC_FLOAT, {-1}); }).values,
              {kNaN, 0, 4});
  check_equal(read_row(NC_DOUBLE, {-2, 0, 4}, [](FileBuilder& f) { f.att("valid_max", NC_DOUBLE, {3}); }).values,
              {-2, 0, kNaN});
  const Row packed = read_row(NC_SHORT, {5, 20, 30}, [](FileBuilder& f) {
    f.att("scale_factor", NC_FLOAT, {0.5}).att("valid_range", NC_SHORT, {10, 25});
  });
  check_equal(packed.values, {kNaN, 10, kNaN});
  CHECK(packed.notices.empty());
}

TEST_CASE("a valid range in the type of unpacked values is compared with those and reported") {
  const Row row = read_row(NC_SHORT, {5, 20, 30}, [](FileBuilder& f) {
    f.att("scale_factor", NC_FLOAT, {0.5}).att("valid_range", NC_FLOAT, {5, 12});
  });
  check_equal(row.values, {kNaN, 10, kNaN});
  CHECK(row.notices == std::vector<std::string>{
                           "variable 'v': valid_range has the type of unpacked values and is compared with those"});
}

TEST_CASE("contradictory valid ranges are reported: valid_range wins, an empty one is not used") {
  const Row both = read_row(NC_FLOAT, {1, 5}, [](FileBuilder& f) {
    f.att("valid_range", NC_FLOAT, {0, 9}).att("valid_min", NC_FLOAT, {3});
  });
  check_equal(both.values, {1, 5});
  CHECK(both.notices ==
        std::vector<std::string>{"variable 'v': has both valid_range and valid_min or valid_max; valid_range is used"});
  const Row empty = read_row(NC_FLOAT, {1, 5}, [](FileBuilder& f) { f.att("valid_range", NC_FLOAT, {9, 0}); });
  check_equal(empty.values, {1, 5});
  CHECK(empty.notices ==
        std::vector<std::string>{"variable 'v': its valid range is empty (lower limit above the upper) "
                                 "and is not used"});
}

TEST_CASE("_FillValue and missing_value of a wrong type are used and reported") {
  const Row wide = read_row(NC_FLOAT, {1, 1e20}, [](FileBuilder& f) { f.att("missing_value", NC_DOUBLE, {1e20}); });
  check_equal(wide.values, {1, kNaN});
  CHECK(wide.notices == std::vector<std::string>{"variable 'v': missing_value has the type double, the variable float; "
                                                 "it is read as 1e+20"});
  const Row text = read_row(NC_FLOAT, {1, -999}, [](FileBuilder& f) { f.att("missing_value", "-999.0"); });
  check_equal(text.values, {1, kNaN});
  CHECK(text.notices == std::vector<std::string>{"variable 'v': missing_value is the text '-999.0', read as a number"});
  const Row unfit = read_row(NC_SHORT, {1, 2}, [](FileBuilder& f) { f.att("missing_value", NC_DOUBLE, {1e20}); });
  check_equal(unfit.values, {1, 2});
  CHECK(unfit.notices == std::vector<std::string>{
                             "variable 'v': missing_value = 1e+20 cannot occur among short values and is not used"});
}

TEST_CASE("a _FillValue of a wrong type, which the library would not write, is used and reported") {
  FileBuilder file("fill.nc");
  file.dim("lat", 2).dim("lon", 2);
  file.var("lat", NC_DOUBLE, {"lat"}, {10, 20}).att("units", "degrees_north");
  file.var("lon", NC_DOUBLE, {"lon"}, {10, 20}).att("units", "degrees_east");
  file.var("v", NC_FLOAT, {"lat", "lon"}, {1, -999, 3, 4}).att("x_illValue", NC_SHORT, {-999});
  std::string bytes = text_of_file(file.done());
  bytes.replace(bytes.find("x_illValue"), 10, "_FillValue");
  Notices notices;
  const auto run = cf::open_run({write_file("fill.nc", bytes)}, "v", notices);
  check_equal(read_all(*run), {1, kNaN, 3, 4});
  CHECK(texts(notices) ==
        std::vector<std::string>{"variable 'v': _FillValue has the type short, the variable float; it "
                                 "is read as -999"});
}

TEST_CASE("_Unsigned turns stored numbers, fill and range into unsigned ones") {
  const Row row = read_row(NC_BYTE, {0, 127, -128, -1, -56}, [](FileBuilder& f) {
    f.att("_Unsigned", "true").att("_FillValue", NC_BYTE, {-1}).att("valid_range", NC_BYTE, {0, -2});
    f.att("scale_factor", NC_FLOAT, {2});
  });
  check_equal(row.values, {0, 254, 256, kNaN, 400});
  CHECK(row.notices.empty());
  const Row wide = read_row(NC_SHORT, {-1, 5}, [](FileBuilder& f) { f.att("_Unsigned", "true"); });
  check_equal(wide.values, {kNaN, 5});  // 65535 is the default fill of unsigned short
}

TEST_CASE("every integer type of netCDF-4 and CDF-5 is read exactly, and says whether float32 holds it") {
  struct Case {
    nc_type type;
    double low, high;
    bool wide;
  };
  for (const Case& c : {Case{NC_BYTE, -128, 127, false}, Case{NC_UBYTE, 0, 255, false},
                        Case{NC_SHORT, -32768, 32766, false}, Case{NC_USHORT, 0, 65534, false},
                        Case{NC_INT, -2147483648.0, 2147483646.0, true}, Case{NC_UINT, 0, 4294967294.0, true},
                        Case{NC_INT64, -0x1p53, 0x1p53, true}, Case{NC_UINT64, 0, 0x1p53, true}}) {
    CAPTURE(c.type);
    for (const int mode : {NC_NETCDF4, NC_64BIT_DATA}) {
      const Row row = read_row(
          c.type, {c.low, 1, c.high}, [](FileBuilder&) {}, mode);
      check_equal(row.values, {c.low, 1, c.high});
      CHECK(row.double_precision == c.wide);
    }
  }
  CHECK(read_row(NC_DOUBLE, {0.1, 1}, [](FileBuilder&) {}).double_precision);
  CHECK(read_row(NC_DOUBLE, {0.1, 1}, [](FileBuilder&) {}).values[0] == 0.1);
}

TEST_CASE("text variables and unreadable packing are errors") {
  CHECK(error_text(Failure::data, [] {
          read_row(NC_SHORT, {1, 2}, [](FileBuilder& f) { f.att("scale_factor", "two"); });
        }) == "row.nc: variable 'v': scale_factor must be one number");
}
