// Rasters through GDAL. Only three local drivers are ever registered, so no file can open another, reach the network or
// be read as NetCDF or HDF5 (those belong to `cf`).
#include "windrow/geo/raster.h"

#include <fmt/format.h>
#include <gdal_frmts.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <mutex>

#include "gdal_handles.h"
#include "windrow/base/error.h"

namespace windrow::geo {
namespace {

constexpr const char* kDrivers[] = {"GTiff", "AAIGrid", "EHdr", nullptr};
/// 2 GiB of doubles; a header that claims more is a mistake or an attack, and a mesh needs no more height than that.
constexpr std::size_t kMostCells = std::size_t{1} << 28;

void register_drivers() {
  static std::once_flag once;
  std::call_once(once, [] {
    GDALRegister_GTiff();
    GDALRegister_AAIGrid();
    GDALRegister_EHdr();
    OSRSetPROJEnableNetwork(0);
  });
}

DatasetHandle open_dataset(const std::string& path, const std::string& place) {
  if (!is_local_file(path)) throw Error(Failure::missing, place, fmt::format("there is no file '{}'", path));
  DatasetHandle dataset(GDALOpenEx(path.c_str(), GDAL_OF_RASTER | GDAL_OF_READONLY, kDrivers, nullptr, nullptr));
  if (!dataset)
    throw Error(Failure::data, place,
                fmt::format("{}is no raster that can be read; expected GeoTIFF, ASCII grid or a labelled binary "
                            "grid (.bil with .hdr){}",
                            subject(path, place), reason()));
  return dataset;
}

/// size + 1 edges; a negative step is turned round by the caller's flip.
std::vector<double> edges(double origin, double step, int size) {
  std::vector<double> out(static_cast<std::size_t>(size) + 1);
  for (std::size_t i = 0; i < out.size(); ++i) out[i] = origin + static_cast<double>(i) * step;
  if (step < 0) std::reverse(out.begin(), out.end());
  return out;
}

/// Missing is judged on stored values before scaling; a float band stores its nodata value as a float.
void mark_missing(GDALRasterBandH band, std::vector<double>& values) {
  constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();
  int given = 0;
  double nodata = GDALGetRasterNoDataValue(band, &given);
  if (given) {
    if (GDALGetRasterDataType(band) == GDT_Float32) nodata = static_cast<double>(static_cast<float>(nodata));
    for (double& v : values)
      if (v == nodata) v = kNaN;
  }
}

/// Mask band kept with the file (for example a GeoTIFF's internal mask): 0 is missing.
void apply_mask(GDALRasterBandH band, int nx, int ny, std::vector<double>& values, const std::string& place) {
  if ((GDALGetMaskFlags(band) & GMF_PER_DATASET) == 0) return;
  std::vector<std::uint8_t> mask(values.size());
  if (GDALRasterIO(GDALGetMaskBand(band), GF_Read, 0, 0, nx, ny, mask.data(), nx, ny, GDT_Byte, 0, 0) != CE_None)
    throw Error(Failure::io, place, "the raster's mask cannot be read" + reason());
  for (std::size_t i = 0; i < values.size(); ++i)
    if (mask[i] == 0) values[i] = std::numeric_limits<double>::quiet_NaN();
}

void unpack(GDALRasterBandH band, std::vector<double>& values) {
  int given = 0;
  const double scale = GDALGetRasterScale(band, &given), offset = GDALGetRasterOffset(band, &given);
  if (scale == 1 && offset == 0) return;
  for (double& v : values) v = v * scale + offset;
}

/// Row by row from the file's order to x and y ascending.
void flip(std::vector<double>& values, std::size_t nx, bool flip_x, bool flip_y) {
  const std::size_t ny = values.size() / nx;
  if (flip_y)
    for (std::size_t j = 0; j < ny / 2; ++j)
      std::swap_ranges(values.begin() + static_cast<std::ptrdiff_t>(j * nx),
                       values.begin() + static_cast<std::ptrdiff_t>((j + 1) * nx),
                       values.begin() + static_cast<std::ptrdiff_t>((ny - 1 - j) * nx));
  if (flip_x)
    for (std::size_t j = 0; j < ny; ++j)
      std::reverse(values.begin() + static_cast<std::ptrdiff_t>(j * nx),
                   values.begin() + static_cast<std::ptrdiff_t>((j + 1) * nx));
}

struct Frame {
  double x0 = 0, dx = 0, y0 = 0, dy = 0;
};

Frame frame_of(GDALDatasetH dataset, const std::string& path, const std::string& place) {
  double g[6] = {};
  if (GDALGetGeoTransform(dataset, g) != CE_None)
    throw Error(Failure::data, place,
                fmt::format("{}does not say where its cells lie (no georeference)", subject(path, place)));
  if (g[2] != 0 || g[4] != 0)
    throw Error(Failure::data, place,
                fmt::format("{}is rotated; expected rows along x and columns along y", subject(path, place)));
  const bool usable = std::isfinite(g[0]) && std::isfinite(g[1]) && std::isfinite(g[3]) && std::isfinite(g[5]);
  if (!usable || g[1] == 0 || g[5] == 0)
    throw Error(Failure::data, place, fmt::format("{}has cells without extent", subject(path, place)));
  return {g[0], g[1], g[3], g[5]};
}

GDALRasterBandH single_band(GDALDatasetH dataset, const std::string& path, const std::string& place) {
  if (GDALGetRasterCount(dataset) != 1)
    throw Error(Failure::data, place,
                fmt::format("{}has {} bands; expected one", subject(path, place), GDALGetRasterCount(dataset)));
  GDALRasterBandH band = GDALGetRasterBand(dataset, 1);
  if (GDALDataTypeIsComplex(GDALGetRasterDataType(band)))
    throw Error(Failure::data, place,
                fmt::format("{}holds complex numbers; expected plain ones", subject(path, place)));
  return band;
}

}  // namespace

Raster read_raster(const std::string& path, const std::string& place) {
  register_drivers();
  const Quiet quiet;
  const DatasetHandle dataset = open_dataset(path, place);
  const Frame frame = frame_of(dataset.get(), path, place);
  const GDALRasterBandH band = single_band(dataset.get(), path, place);
  const int nx = GDALGetRasterXSize(dataset.get()), ny = GDALGetRasterYSize(dataset.get());
  const std::size_t cells = static_cast<std::size_t>(nx) * static_cast<std::size_t>(ny);
  if (cells > kMostCells)
    throw Error(Failure::data, place,
                fmt::format("{}has {} cells, more than {}; cut it to the mesh's window", subject(path, place), cells,
                            kMostCells));

  Raster out;
  out.values.resize(cells);
  if (GDALRasterIO(band, GF_Read, 0, 0, nx, ny, out.values.data(), nx, ny, GDT_Float64, 0, 0) != CE_None)
    throw Error(Failure::io, place, fmt::format("{}cannot be read to its end{}", subject(path, place), reason()));
  mark_missing(band, out.values);
  apply_mask(band, nx, ny, out.values, place);
  unpack(band, out.values);
  flip(out.values, static_cast<std::size_t>(nx), frame.dx < 0, frame.dy < 0);
  out.x_edges = edges(frame.x0, frame.dx, nx);
  out.y_edges = edges(frame.y0, frame.dy, ny);
  out.crs_wkt = horizontal_wkt(GDALGetSpatialRef(dataset.get()));
  const char* units = GDALGetRasterUnitType(band);
  out.units = units ? units : "";
  return out;
}

bool looks_like_raster(const std::string& path) {
  if (!is_local_file(path)) return false;
  register_drivers();
  const Quiet quiet;
  return GDALIdentifyDriverEx(path.c_str(), GDAL_OF_RASTER, kDrivers, nullptr) != nullptr;
}

}  // namespace windrow::geo
