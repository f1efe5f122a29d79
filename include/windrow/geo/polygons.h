// Polygons of vector layers through GDAL (named local drivers only): catchments and masks.
#pragma once
#include <string>
#include <vector>

#include "windrow/geo/crs.h"
#include "windrow/mesh/cell_records.h"

namespace windrow::geo {

struct PolygonLayer {
  std::string layer;                      ///< name of the layer read
  std::vector<mesh::PolygonCell> cells;   ///< one a feature, in the file's order
  std::vector<std::string> ids;           ///< unique; of the id column, else "1", "2", ...
  std::string crs_wkt;                    ///< for make_crs; empty: none given
  std::size_t dropped_rings = 0;          ///< rings of fewer than three different points, which bound no area
};

/// `layer` and `id` may be empty: then the file must hold one layer; ids are feature numbers. Geometries other than
/// polygons and multipolygons are Error(data), as are ids that repeat or are empty, and a geometry that is not valid
/// (GEOS says why and where). Error(missing): no such local file, layer or column (near miss named).
PolygonLayer read_polygons(const std::string& path, const std::string& layer, const std::string& id,
                           const std::string& place);
bool looks_like_vector(const std::string& path);

}  // namespace windrow::geo
