// Rasters through GDAL (named local drivers only: GTiff, AAIGrid, VRT excluded). Used for the mesh's height.
#pragma once
#include <string>
#include <vector>

#include "windrow/geo/crs.h"

namespace windrow::geo {

struct Raster {
  std::vector<double> x_edges, y_edges;  ///< ascending, in the raster's CRS
  std::string crs_wkt;                   ///< empty: none given
  std::vector<double> values;            ///< row by row, y ascending; NaN where nodata
  std::string units;                     ///< of the band, may be empty
};

/// Error(missing) no such file, Error(data) not a raster GDAL reads with the named drivers, or rotated geotransform.
Raster read_raster(const std::string& path, const std::string& place);
bool looks_like_raster(const std::string& path);

}  // namespace windrow::geo
