// Rasters: orientation, missing values, packing, and what is refused.
#include <doctest/doctest.h>
#include <gdal.h>
#include <gdal_frmts.h>
#include <unistd.h>

#include <cmath>
#include <cstring>
#include <filesystem>
#include <fstream>

#include "windrow/base/error.h"
#include "windrow/geo/raster.h"

using namespace windrow;

namespace {

/// A folder of its own that goes away with the test.
struct Folder {
  std::filesystem::path path;
  Folder() : path(std::filesystem::temp_directory_path() / ("windrow_raster_" + std::to_string(::getpid()))) {
    std::filesystem::create_directories(path);
  }
  ~Folder() { std::filesystem::remove_all(path); }
  std::string write(const std::string& name, const std::string& bytes) const {
    std::filesystem::remove(path / name);  // some file systems sync a file that is written over
    std::ofstream(path / name, std::ios::binary) << bytes;
    return (path / name).string();
  }
};

struct Made {
  double geotransform[6] = {100, 10, 0, 500, 0, -10};
  GDALDataType type = GDT_Float32;
  std::vector<double> values = {1, 2, 3, 4, 5, 6};  // 3 columns, 2 rows
  int bands = 1;
  bool has_nodata = false;
  double nodata = 0;
  double scale = 1, offset = 0;
  bool georeferenced = true;
  std::string wkt;
};

std::string make_tiff(const Folder& folder, const std::string& name, Made m) {
  GDALRegister_GTiff();
  const std::string path = (folder.path / name).string();
  GDALDatasetH d = GDALCreate(GDALGetDriverByName("GTiff"), path.c_str(), 3, 2, m.bands, m.type, nullptr);
  REQUIRE(d != nullptr);
  if (m.georeferenced) GDALSetGeoTransform(d, m.geotransform);
  if (!m.wkt.empty()) GDALSetProjection(d, m.wkt.c_str());
  GDALRasterBandH band = GDALGetRasterBand(d, 1);
  if (m.has_nodata) GDALSetRasterNoDataValue(band, m.nodata);
  if (m.scale != 1) GDALSetRasterScale(band, m.scale);
  if (m.offset != 0) GDALSetRasterOffset(band, m.offset);
  CHECK(GDALRasterIO(band, GF_Write, 0, 0, 3, 2, m.values.data(), 3, 2, GDT_Float64, 0, 0) == CE_None);
  GDALClose(d);
  return path;
}

std::string refusal(const std::string& path, Failure kind) {
  try {
    geo::read_raster(path, "mesh.elevation");
  } catch (const Error& e) {
    CHECK(e.kind() == kind);
    return e.what();
  }
  return "accepted";
}

}  // namespace

TEST_CASE("rows come with y ascending whichever way the file counts them") {
  const Folder folder;
  const std::vector<double> ascending = {4, 5, 6, 1, 2, 3};
  const auto north_up = geo::read_raster(make_tiff(folder, "n.tif", {}), "t");
  CHECK(north_up.values == ascending);
  CHECK(north_up.x_edges == std::vector<double>{100, 110, 120, 130});
  CHECK(north_up.y_edges == std::vector<double>{480, 490, 500});
  Made south;
  south.geotransform[3] = 480;
  south.geotransform[5] = 10;
  south.values = ascending;
  const auto south_up = geo::read_raster(make_tiff(folder, "s.tif", south), "t");
  CHECK(south_up.values == ascending);
  CHECK(south_up.y_edges == north_up.y_edges);
  Made west;
  west.geotransform[0] = 130;
  west.geotransform[1] = -10;
  west.values = {3, 2, 1, 6, 5, 4};
  const auto westward = geo::read_raster(make_tiff(folder, "w.tif", west), "t");
  CHECK(westward.values == ascending);
  CHECK(westward.x_edges == north_up.x_edges);
}

TEST_CASE("missing is judged before scaling, and scale and offset are applied") {
  const Folder folder;
  Made packed;
  packed.type = GDT_Int16;
  packed.values = {10, 20, 30, -9999, 50, 60};
  packed.has_nodata = true;
  packed.nodata = -9999;
  packed.scale = 0.5;
  packed.offset = 100;
  const auto r = geo::read_raster(make_tiff(folder, "p.tif", packed), "t");
  CHECK(std::isnan(r.values[0]));
  CHECK(r.values[1] == 125);
  CHECK(r.values[3] == 105);
}

TEST_CASE("a float band's nodata value is compared as a float") {
  const Folder folder;
  Made m;
  m.has_nodata = true;
  m.nodata = -3.4028234663852886e38;  // stored as float
  m.values = {m.nodata, 0.1, 3, 4, 5, 6};
  auto r = geo::read_raster(make_tiff(folder, "f.tif", m), "t");
  CHECK(std::isnan(r.values[3]));
  m.nodata = 0.1;  // no float is exactly 0.1
  r = geo::read_raster(make_tiff(folder, "g.tif", m), "t");
  CHECK(std::isnan(r.values[4]));
  CHECK_FALSE(std::isnan(r.values[3]));
}

TEST_CASE("an ASCII grid written by hand is read as its format's description says") {
  // ESRI ASCII raster: first row is the northernmost, xllcorner is the lower left corner.
  const Folder folder;
  const std::string path = folder.write(
      "h.asc", "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 480\ncellsize 10\nNODATA_value -99\n1 2 3\n4 -99 6.5\n");
  CHECK(geo::looks_like_raster(path));
  const auto r = geo::read_raster(path, "t");
  CHECK(r.x_edges == std::vector<double>{100, 110, 120, 130});
  CHECK(r.y_edges == std::vector<double>{480, 490, 500});
  CHECK(r.values[0] == 4);
  CHECK(std::isnan(r.values[1]));
  CHECK(r.values[2] == 6.5);
  CHECK(r.values[5] == 3);
  CHECK(r.crs_wkt.empty());
}

TEST_CASE("a labelled binary grid written by hand is read with its header") {
  const Folder folder;
  const std::int16_t rows[] = {1, 2, 3, 4, 5, 6};
  std::string bytes(sizeof rows, '\0');
  std::memcpy(bytes.data(), rows, sizeof rows);
  const std::string path = folder.write("b.bil", bytes);
  folder.write("b.hdr",
               "NROWS 2\nNCOLS 3\nNBANDS 1\nNBITS 16\nPIXELTYPE SIGNEDINT\nBYTEORDER I\nLAYOUT BIL\nULXMAP 105\n"
               "ULYMAP 495\nXDIM 10\nYDIM 10\n");
  const auto r = geo::read_raster(path, "t");
  CHECK(r.values == std::vector<double>{4, 5, 6, 1, 2, 3});
  CHECK(r.x_edges.front() == 100);
  CHECK(r.y_edges.back() == 500);
}

TEST_CASE("a raster's system can be given to make_crs, heights stripped") {
  const Folder folder;
  Made m;
  m.wkt = geo::make_crs("EPSG:3035", "t").wkt;
  auto r = geo::read_raster(make_tiff(folder, "c.tif", m), "t");
  CHECK(geo::make_crs(r.crs_wkt, "t").grid_mapping.name == "lambert_azimuthal_equal_area");
  m.wkt =
      "COMPD_CS[\"c\",GEOGCS[\"WGS 84\",DATUM[\"WGS_1984\",SPHEROID[\"WGS 84\",6378137,298.257223563]],"
      "PRIMEM[\"Greenwich\",0],UNIT[\"degree\",0.0174532925199433]],VERT_CS[\"EGM96 height\","
      "VERT_DATUM[\"EGM96 geoid\",2005],UNIT[\"metre\",1],AXIS[\"Up\",UP]]]";
  r = geo::read_raster(make_tiff(folder, "v.tif", m), "t");
  CHECK_FALSE(geo::make_crs(r.crs_wkt, "t").projected);
}

TEST_CASE("what cannot serve as a raster is refused in one line") {
  const Folder folder;
  CHECK(refusal((folder.path / "none.tif").string(), Failure::missing) ==
        "mesh.elevation: there is no file '" + (folder.path / "none.tif").string() + "'");
  CHECK(refusal("/vsicurl/http://localhost/x.tif", Failure::missing).find("there is no file") != std::string::npos);
  const std::string text = folder.write("t.txt", "hello");
  CHECK(refusal(text, Failure::data).find("is no raster that can be read") != std::string::npos);
  CHECK_FALSE(geo::looks_like_raster(text));
  const std::string virtual_one =
      folder.write("v.vrt", "<VRTDataset rasterXSize=\"1\" rasterYSize=\"1\"></VRTDataset>");
  CHECK(refusal(virtual_one, Failure::data).find("is no raster that can be read") != std::string::npos);
  CHECK(refusal(folder.write("x.nc", "CDF\x01"), Failure::data).find("is no raster") != std::string::npos);
  Made m;
  m.geotransform[2] = 1;
  CHECK(refusal(make_tiff(folder, "r.tif", m), Failure::data).find("is rotated") != std::string::npos);
  m = {};
  m.bands = 2;
  CHECK(refusal(make_tiff(folder, "two.tif", m), Failure::data).find("has 2 bands; expected one") != std::string::npos);
  m = {};
  m.georeferenced = false;
  CHECK(refusal(make_tiff(folder, "nowhere.tif", m), Failure::data).find("no georeference") != std::string::npos);
  m = {};
  m.type = GDT_CFloat32;
  CHECK(refusal(make_tiff(folder, "complex.tif", m), Failure::data).find("complex") != std::string::npos);
  const std::string huge =
      folder.write("huge.asc", "ncols 100000\nnrows 100000\nxllcorner 0\nyllcorner 0\ncellsize 1\n1 2 3\n");
  CHECK(refusal(huge, Failure::data).find("cut it to the mesh's window") != std::string::npos);
}

TEST_CASE("a raster damaged or cut at any byte is read or refused, never more") {
  const Folder folder;
  const std::string path = make_tiff(folder, "whole.tif", {});
  std::ifstream in(path, std::ios::binary);
  const std::string bytes((std::istreambuf_iterator<char>(in)), {});
  const auto attempt = [&](const std::string& content) {
    const std::string p = folder.write("damaged.tif", content);
    try {
      const auto r = geo::read_raster(p, "t");
      CHECK(r.values.size() == (r.x_edges.size() - 1) * (r.y_edges.size() - 1));
    } catch (const Error& e) {
      CHECK((e.kind() == Failure::data || e.kind() == Failure::io));
    }
  };
  for (std::size_t i = 0; i < bytes.size(); ++i) {
    std::string damaged = bytes;
    damaged[i] = static_cast<char>(damaged[i] ^ 0x7F);
    attempt(damaged);
    attempt(bytes.substr(0, i));
  }
}
