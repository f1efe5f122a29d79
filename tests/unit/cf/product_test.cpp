// Products: what was given comes back through netCDF-C, whatever the shape; two writes give the same bytes.
#include <doctest/doctest.h>
#include <netcdf.h>
#include <unistd.h>

#include <chrono>
#include <filesystem>
#include <fstream>
#include <random>
#include <thread>

#include "sample_product.h"
#include "windrow/base/error.h"

using namespace windrow;

namespace {

struct Folder {
  std::filesystem::path path;
  Folder() : path(std::filesystem::temp_directory_path() / ("windrow_product_" + std::to_string(::getpid()))) {
    std::filesystem::create_directories(path);
  }
  ~Folder() { std::filesystem::remove_all(path); }
  std::string operator/(const std::string& name) const { return (path / name).string(); }
};

std::string bytes_of_file(const std::string& path) {
  std::ifstream in(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(in), {}};
}

/// Straight through netCDF-C, so that the project's own reader is not its own judge.
std::vector<float> floats(const std::string& path, const char* name) {
  const std::scoped_lock lock(cf::library_mutex());
  int file = -1, id = -1, rank = 0, dims[8];
  REQUIRE(nc_open(path.c_str(), NC_NOWRITE, &file) == NC_NOERR);
  REQUIRE(nc_inq_varid(file, name, &id) == NC_NOERR);
  REQUIRE(nc_inq_var(file, id, nullptr, nullptr, &rank, dims, nullptr) == NC_NOERR);
  std::size_t count = 1;
  for (int i = 0; i < rank; ++i) {
    std::size_t length = 0;
    REQUIRE(nc_inq_dimlen(file, dims[i], &length) == NC_NOERR);
    count *= length;
  }
  std::vector<float> out(count, -12345.0F);  // with no-fill, an unwritten chunk would leave this behind
  REQUIRE(nc_get_var_float(file, id, out.data()) == NC_NOERR);
  REQUIRE(nc_close(file) == NC_NOERR);
  return out;
}

const cf::Attribute* named(const std::vector<cf::Attribute>& attributes, const std::string& name) {
  for (const auto& a : attributes)
    if (a.name == name) return &a;
  return nullptr;
}

}  // namespace

TEST_CASE("every value of a product comes back, edge chunks and missing values included") {
  const Folder folder;
  for (const bool unlimited : {false, true})
    for (const bool deflate : {false, true}) {
      CAPTURE(unlimited);
      CAPTURE(deflate);
      const std::string path = folder / "p.nc";
      const auto p = sample::make(unlimited, deflate);
      sample::write(path, p);
      for (std::size_t v = 0; v < p.chunked.size(); ++v) {
        const auto got = floats(path, p.chunked[v].name.c_str());
        REQUIRE(got.size() == sample::kTime * sample::kY * sample::kX);
        std::size_t wrong = 0, i = 0;
        for (std::size_t t = 0; t < sample::kTime; ++t)
          for (std::size_t y = 0; y < sample::kY; ++y)
            for (std::size_t x = 0; x < sample::kX; ++x) wrong += got[i++] != sample::value(v, t, y, x);
        CHECK(wrong == 0);
      }
      const auto reader = cf::open_product(path);
      for (const auto& s : p.small) {
        CAPTURE(s.name);
        const auto got = reader->values(s.name);
        REQUIRE(got.size() == s.values.size());
        for (std::size_t i = 0; i < got.size(); ++i)
          CHECK(got[i] ==
                (s.type == cf::Type::float32 ? static_cast<double>(static_cast<float>(s.values[i])) : s.values[i]));
      }
    }
}

TEST_CASE("attributes come back with their text and type") {
  const Folder folder;
  const std::string path = folder / "a.nc";
  sample::write(path, sample::make(true, true));
  const auto reader = cf::open_product(path);
  const auto global = reader->global_attributes();
  REQUIRE(named(global, "Conventions") != nullptr);
  CHECK(named(global, "Conventions")->text == "CF-1.13");
  CHECK(named(global, "large")->numbers == std::vector<double>{5e9});
  CHECK(named(global, "bounds_of_range")->numbers == std::vector<double>{-1.5, 2.5});
  CHECK(named(global, "empty") != nullptr);
  const auto tas = reader->attributes("tas");
  CHECK(named(tas, "_FillValue")->numbers == std::vector<double>{static_cast<double>(sample::kFill)});
  CHECK(named(tas, "cell_methods")->text == "time: mean");
  CHECK(named(reader->attributes("status_flag"), "flag_values")->numbers == std::vector<double>{0, 1, 2});
  const auto dims = reader->dimensions("tas");
  REQUIRE(dims.size() == 3);
  CHECK(dims[0].name == "time");
  CHECK(dims[0].length == sample::kTime);
  CHECK(dims[0].unlimited);
  CHECK_FALSE(dims[1].unlimited);
  const std::scoped_lock lock(cf::library_mutex());
  int file = -1, id = -1, shuffle = 0, deflate = 0, level = 0, no_fill = 0;
  nc_type type = NC_NAT;
  REQUIRE(nc_open(path.c_str(), NC_NOWRITE, &file) == NC_NOERR);
  CHECK(nc_inq_atttype(file, NC_GLOBAL, "Conventions", &type) == NC_NOERR);
  CHECK(type == NC_CHAR);
  nc_inq_varid(file, "tasmax", &id);
  CHECK(nc_inq_var_deflate(file, id, &shuffle, &deflate, &level) == NC_NOERR);
  CHECK(shuffle == 1);
  CHECK(level == 6);
  CHECK(nc_inq_var_fill(file, id, &no_fill, nullptr) == NC_NOERR);
  CHECK(no_fill == 1);
  nc_inq_varid(file, "cover", &id);
  CHECK(nc_inq_var_deflate(file, id, &shuffle, &deflate, &level) == NC_NOERR);
  CHECK(shuffle == 0);
  CHECK(deflate == 0);
  nc_close(file);
}

TEST_CASE("steps are read as stored") {
  const Folder folder;
  const std::string path = folder / "s.nc";
  sample::write(path, sample::make(true, true));
  const auto reader = cf::open_product(path);
  std::vector<float> out;
  reader->read_steps("tas", 3, 5, out);
  REQUIRE(out.size() == 2 * sample::kY * sample::kX);
  CHECK(out[0] == sample::value(0, 3, 0, 0));
  CHECK(out.back() == sample::kFill);
  reader->read_steps("tas", 2, 2, out);
  CHECK(out.empty());
  CHECK_THROWS_AS(reader->read_steps("tas", 4, 6, out), Error);
  CHECK_THROWS_AS(reader->values("nothing"), Error);
}

TEST_CASE("two writes of one product are the same file, byte for byte, a second apart too") {
  const Folder folder;
  const auto p = sample::make(true, true);
  sample::write(folder / "one.nc", p);
  std::this_thread::sleep_for(std::chrono::milliseconds(1100));
  sample::write(folder / "another_name.nc", p);
  const std::string one = bytes_of_file(folder / "one.nc");
  CHECK(one.size() > 5000);
  CHECK(one == bytes_of_file(folder / "another_name.nc"));
}

TEST_CASE("any shape and chunking comes back whole") {
  const Folder folder;
  std::mt19937 random(20240607);
  for (int round = 0; round < 40; ++round) {
    cf::ProductFile p;
    const std::size_t rank = 1 + random() % 4;
    cf::ChunkedVariable v;
    v.name = "v";
    v.level = static_cast<int>(random() % 3);
    for (std::size_t i = 0; i < rank; ++i) {
      const std::string name = "d" + std::to_string(i);
      const std::size_t length = 1 + random() % 9;
      p.dimensions.push_back({name, length, i == 0 && random() % 2 == 0});
      v.dimensions.push_back(name);
      v.chunk.push_back(p.dimensions[i].unlimited ? 1 + random() % 12 : 1 + random() % length);
    }
    p.chunked.push_back(v);
    const auto grid = cf::chunk_grid(p, 0);
    std::vector<std::byte> held;
    const auto chunk = [&](std::size_t, std::size_t index) -> std::span<const std::byte> {
      std::size_t size = 1;
      for (const std::size_t n : v.chunk) size *= n;
      std::vector<float> values(size);
      for (std::size_t k = 0; k < size; ++k) {  // value: the element's row-major number in the whole array
        std::size_t rest_chunk = index, rest = k, stride = 1;
        double number = 0;
        for (std::size_t i = rank; i-- > 0;) {
          number += static_cast<double>((rest_chunk % grid[i] * v.chunk[i] + rest % v.chunk[i]) * stride);
          stride *= p.dimensions[i].length;
          rest_chunk /= grid[i];
          rest /= v.chunk[i];
        }
        values[k] = static_cast<float>(number);
      }
      const auto raw = std::as_bytes(std::span(values));
      std::vector<std::byte> shuffled(raw.size());
      held.assign(raw.begin(), raw.end());
      if (v.level > 0) {
        codec::shuffle(raw, sizeof(float), shuffled);
        codec::Deflater(v.level).compress(shuffled, held);
      }
      return held;
    };
    CAPTURE(round);
    const std::string path = folder / "any.nc";
    cf::write_product(path, p, chunk);
    const auto got = floats(path, "v");
    std::size_t wrong = 0;
    for (std::size_t i = 0; i < got.size(); ++i) wrong += got[i] != static_cast<float>(i);
    CHECK(wrong == 0);
  }
}

TEST_CASE("a large variable given whole is cut into chunks and comes back") {
  const Folder folder;
  cf::ProductFile p;
  p.dimensions = {{"y", 701, false}, {"x", 900, false}};
  cf::SmallVariable lat{"lat", cf::Type::float64, {"y", "x"}, {}, {}, true};
  for (std::size_t i = 0; i < 701U * 900U; ++i) lat.values.push_back(static_cast<double>(i) * 1e-5);
  p.small = {lat};
  cf::write_product(folder / "l.nc", p, [](std::size_t, std::size_t) { return std::span<const std::byte>(); });
  CHECK(cf::open_product(folder / "l.nc")->values("lat") == lat.values);
}
