// Rasters through GDAL (three local drivers only: GTiff, AAIGrid, EHdr). Used for the mesh's height.
#pragma once
#include <string>
#include <vector>

#include "windrow/geo/crs.h"

namespace windrow::geo {

struct Raster {
  std::vector<double> x_edges, y_edges;  ///< ascending, in the raster's CRS
  std::string crs_wkt;                   ///< horizontal part, for make_crs; empty: none given
  std::vector<double> values;            ///< row by row, y ascending; NaN where nodata
  std::string units;                     ///< of the band, may be empty
};

/// Missing values are judged as stored, then scale and offset are applied. Error(missing): no such local file (/vsi
/// paths are none). Error(data): not a raster of the named formats, no georeference, rotated, several bands, complex
/// numbers, or over 2^28 cells. Error(io): damaged.
Raster read_raster(const std::string& path, const std::string& place);
bool looks_like_raster(const std::string& path);

}  // namespace windrow::geo
