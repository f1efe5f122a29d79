// Coordinate reference systems through PROJ: projectors for meshes, CF grid-mapping attributes and WKT for products.
#pragma once
#include <string>
#include <utility>
#include <variant>
#include <vector>

#include "windrow/mesh/projector.h"

namespace windrow::geo {

struct GridMapping {
  std::string name;  ///< CF grid_mapping_name; empty when CF has none for this projection (then only crs_wkt is written)
  std::vector<std::pair<std::string, std::variant<std::string, double, std::vector<double>>>> attributes;
};

/// A projected or geographic CRS. Geodetic latitude and longitude are those of its own base CRS: no datum shift.
struct Crs {
  std::string definition;   ///< as given
  std::string wkt;          ///< WKT2:2019, one line
  std::string name;
  bool projected = false;
  std::string units;        ///< axis units of a projected CRS ("m"); degrees otherwise
  double semi_major_m = 0;
  double inverse_flattening = 0;  ///< 0: sphere
  GridMapping grid_mapping;
  mesh::Projector to_geographic;    ///< x, y -> longitude, latitude in degrees
  mesh::Projector from_geographic;
};

/// Error(job) at `place` when PROJ does not know the definition or it is no 2-D horizontal CRS. Network access is off.
Crs make_crs(const std::string& definition, const std::string& place);

}  // namespace windrow::geo
