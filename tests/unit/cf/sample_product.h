// An invented small product with every kind of variable a product can hold, and its chunks. Test only; shared by the
// unit tests and the tool that writes it for the reference script.
#pragma once
#include <algorithm>
#include <cstring>
#include <map>
#include <string>
#include <vector>

#include "windrow/cf/product.h"
#include "windrow/codec/codec.h"

namespace windrow::sample {

inline constexpr std::size_t kTime = 5, kY = 7, kX = 10;
inline constexpr float kFill = 9.96920997e36F;

/// The value at a place, by formula (the reference script knows the same one); missing in one corner.
inline float value(std::size_t variable, std::size_t t, std::size_t y, std::size_t x) {
  if (variable != 2 && y == kY - 1 && x == kX - 1) return kFill;
  if (variable == 2) return static_cast<float>(y * kX + x) / static_cast<float>(kY * kX);
  return static_cast<float>(280 + 100 * variable) + static_cast<float>(t) + 0.5F * static_cast<float>(y) +
         0.25F * static_cast<float>(x);
}

inline std::vector<cf::NamedValue> crs_attributes() {
  return {{"grid_mapping_name", std::string("lambert_azimuthal_equal_area")},
          {"latitude_of_projection_origin", 52.0},
          {"longitude_of_projection_origin", 10.0},
          {"false_easting", 4321000.0},
          {"false_northing", 3210000.0},
          {"semi_major_axis", 6378137.0},
          {"inverse_flattening", 298.257222101},
          {"longitude_of_prime_meridian", 0.0}};
}

inline std::vector<cf::SmallVariable> small_variables(bool deflate) {
  using cf::Type;
  std::vector<double> time, time_bounds, x, y, lat, lon, flag;
  for (std::size_t t = 0; t < kTime; ++t) {
    time.push_back(static_cast<double>(t) + 0.5);
    time_bounds.insert(time_bounds.end(), {static_cast<double>(t), static_cast<double>(t) + 1});
  }
  for (std::size_t j = 0; j < kY; ++j) y.push_back(3000000.0 + 5000.0 * static_cast<double>(j));
  for (std::size_t i = 0; i < kX; ++i) x.push_back(4000000.0 + 5000.0 * static_cast<double>(i));
  for (std::size_t j = 0; j < kY; ++j)
    for (std::size_t i = 0; i < kX; ++i) {
      lat.push_back(50.0 + 0.045 * static_cast<double>(j));
      lon.push_back(5.5 + 0.07 * static_cast<double>(i));
      flag.push_back(static_cast<double>((i + j) % 3));
    }
  return {
      {"time",
       Type::float64,
       {"time"},
       {{"units", std::string("days since 2001-01-01")},
        {"calendar", std::string("standard")},
        {"standard_name", std::string("time")},
        {"axis", std::string("T")},
        {"bounds", std::string("time_bnds")}},
       time,
       false},
      {"time_bnds", Type::float64, {"time", "bnds"}, {}, time_bounds, false},
      {"y",
       Type::float64,
       {"y"},
       {{"standard_name", std::string("projection_y_coordinate")},
        {"units", std::string("m")},
        {"axis", std::string("Y")}},
       y,
       false},
      {"x",
       Type::float64,
       {"x"},
       {{"standard_name", std::string("projection_x_coordinate")},
        {"units", std::string("m")},
        {"axis", std::string("X")}},
       x,
       false},
      {"lat",
       Type::float64,
       {"y", "x"},
       {{"standard_name", std::string("latitude")}, {"units", std::string("degrees_north")}},
       lat,
       deflate},
      {"lon",
       Type::float64,
       {"y", "x"},
       {{"standard_name", std::string("longitude")}, {"units", std::string("degrees_east")}},
       lon,
       deflate},
      {"crs", Type::int32, {}, crs_attributes(), {0}, false},
      {"status_flag",
       Type::int8,
       {"y", "x"},
       {{"standard_name", std::string("status_flag")},
        {"flag_values", std::vector<std::int8_t>{0, 1, 2}},
        {"flag_meanings", std::string("adjusted filled masked")}},
       flag,
       deflate},
      {"height", Type::float32, {"y", "x"}, {{"units", std::string("m")}, {"_FillValue", -1.0F}}, lat, deflate},
  };
}

inline cf::ProductFile make(bool unlimited, bool deflate) {
  cf::ProductFile p;
  p.dimensions = {{"time", kTime, unlimited}, {"y", kY, false}, {"x", kX, false}, {"bnds", 2, false}};
  p.small = small_variables(deflate);
  const std::vector<cf::NamedValue> common = {{"grid_mapping", std::string("crs")},
                                              {"coordinates", std::string("lat lon")}};
  const auto with = [&](std::vector<cf::NamedValue> own) {
    own.insert(own.end(), common.begin(), common.end());
    return own;
  };
  p.chunked = {{"tas",
                {"time", "y", "x"},
                {2, 3, 4},
                1,
                kFill,
                with({{"units", std::string("K")},
                      {"standard_name", std::string("air_temperature")},
                      {"cell_methods", std::string("time: mean")}})},
               {"tasmax",
                {"time", "y", "x"},
                {3, 7, 10},
                6,
                kFill,
                with({{"units", std::string("K")}, {"standard_name", std::string("air_temperature")}})},
               {"cover",
                {"time", "y", "x"},
                {1, 5, 3},
                0,
                kFill,
                with({{"units", std::string("1")}, {"long_name", std::string("cover")}})}};
  p.global = {{"Conventions", std::string("CF-1.13")},
              {"title", std::string("invented values")},
              {"empty", std::string()},
              {"count", std::int32_t{3}},
              {"large", std::int64_t{5000000000}},
              {"tiny", std::int8_t{-2}},
              {"half", 0.5F},
              {"bounds_of_range", std::vector<double>{-1.5, 2.5}}};
  return p;
}

/// One chunk as it goes to disk: edge chunks at full size, then shuffle and deflate unless level 0.
inline std::vector<std::byte> chunk_bytes(const cf::ProductFile& p, std::size_t variable, std::size_t index) {
  const auto& v = p.chunked[variable];
  const auto grid = cf::chunk_grid(p, variable);
  const std::size_t c[3] = {index / (grid[1] * grid[2]), index / grid[2] % grid[1], index % grid[2]};
  std::vector<float> values;
  for (std::size_t a = 0; a < v.chunk[0]; ++a)
    for (std::size_t b = 0; b < v.chunk[1]; ++b)
      for (std::size_t d = 0; d < v.chunk[2]; ++d) {
        const std::size_t t = c[0] * v.chunk[0] + a, y = c[1] * v.chunk[1] + b, x = c[2] * v.chunk[2] + d;
        values.push_back(t < kTime && y < kY && x < kX ? value(variable, t, y, x) : 0.0F);
      }
  const auto raw = std::as_bytes(std::span(values));
  if (v.level == 0) return {raw.begin(), raw.end()};
  std::vector<std::byte> shuffled(raw.size()), packed;
  codec::shuffle(raw, sizeof(float), shuffled);
  codec::Deflater(v.level).compress(shuffled, packed);
  return packed;
}

inline void write(const std::string& path, const cf::ProductFile& p) {
  std::vector<std::byte> held;
  cf::write_product(path, p, [&](std::size_t variable, std::size_t index) -> std::span<const std::byte> {
    held = chunk_bytes(p, variable, index);
    return held;
  });
}

}  // namespace windrow::sample
