// Laws of damaged files: a truncated or foreign file is refused in one line, wherever it was cut.
#include <doctest/doctest.h>

#include "sample_run.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

std::string open_error(Failure kind, const std::string& path) {
  return error_text(kind, [&] {
    Notices notices;
    cf::open_run({path}, "v", notices);
  });
}

Sample small() {
  Sample sample;
  sample.lat = {-10, 0, 10};
  sample.lon = {0, 10, 20};
  return sample;
}

}  // namespace

TEST_CASE("an absent file is missing, a foreign one is no NetCDF file") {
  CHECK(open_error(Failure::missing, scratch("absent.nc")) == "absent.nc: no such file");
  for (const std::string bytes : {"", "C", "CDF", "CDF\3 and more", "GRIB....7777", "\x89PNG\r\n\x1a\n........"}) {
    const std::string path = write_file("foreign.nc", bytes);
    CHECK_FALSE(cf::looks_like_netcdf(path));
    CHECK(open_error(Failure::data, path) == "foreign.nc: not a NetCDF file (classic, 64-bit offset or netCDF-4)");
  }
  CHECK_FALSE(cf::looks_like_netcdf(scratch("absent.nc")));
  CHECK_FALSE(cf::looks_like_netcdf(scratch("")));
}

TEST_CASE("a file cut at any byte is refused as truncated, with both lengths once the header is whole") {
  for (const int mode : {0, NC_64BIT_OFFSET, NC_64BIT_DATA}) {
    CAPTURE(mode);
    Sample sample = small();
    sample.mode = mode;
    const std::string whole = text_of_file(sample.write());
    std::size_t with_lengths = 0;
    const std::string path = write_file("cut.nc", whole);
    for (std::size_t n = whole.size() - 1; n >= 4; --n) {
      std::filesystem::resize_file(path, n);
      const std::string text = open_error(Failure::data, path);
      const std::string start = "cut.nc: the file is truncated: " + std::to_string(n) + " bytes, the header ";
      REQUIRE(text.starts_with(start));
      with_lengths += text == start + "asks for " + std::to_string(whole.size());
    }
    CHECK(with_lengths > 4 * 4 * 9);  // at least all cuts inside the data
  }
}

TEST_CASE("the padding after the last value may be missing, one byte less may not") {
  FileBuilder file("padding.nc");
  file.dim("lat", 3).dim("lon", 3);
  file.var("lat", NC_DOUBLE, {"lat"}, {-10, 0, 10}).att("units", "degrees_north");
  file.var("lon", NC_DOUBLE, {"lon"}, {0, 10, 20}).att("units", "degrees_east");
  file.var("v", NC_BYTE, {"lat", "lon"}, steps(1, 1, 9));  // 9 bytes, padded to 12
  const std::string whole = text_of_file(file.done());
  Notices notices;
  const auto run = cf::open_run({write_file("cut.nc", whole.substr(0, whole.size() - 3))}, "v", notices);
  CHECK(read_all(*run) == steps(1, 1, 9));
  open_error(Failure::data, write_file("cut.nc", whole.substr(0, whole.size() - 4)));
}

TEST_CASE("a truncated netCDF-4 file is refused with both lengths") {
  Sample sample = small();
  sample.mode = NC_NETCDF4;
  const std::string whole = text_of_file(sample.write());
  for (std::size_t n = 100; n < whole.size(); n += 97)
    CHECK(open_error(Failure::data, write_file("cut.nc", whole.substr(0, n))) ==
          "cut.nc: the file is truncated: " + std::to_string(n) + " bytes, the header asks for " +
              std::to_string(whole.size()));
}

TEST_CASE("a classic file with any one byte changed is read or refused, never more") {
  const std::string whole = text_of_file(small().write());
  const std::string path = write_file("flip.nc", whole);
  std::fstream file(path, std::ios::binary | std::ios::in | std::ios::out);
  const auto put = [&](std::size_t n, char byte) { file.seekp(std::streamoff(n)).put(byte).flush(); };
  std::size_t refused = 0;
  for (std::size_t n = 0; n < whole.size() - 4 * 4 * 9; ++n) {
    for (const char flip : {char(0xFF), char(0x01)}) {
      put(n, char(whole[n] ^ flip));
      try {
        Notices notices;
        read_all(*cf::open_run({path}, "v", notices));
      } catch (const Error&) {
        ++refused;
      }
    }
    put(n, whole[n]);
  }
  CHECK(refused > 100);
}
