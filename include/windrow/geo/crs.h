// Coordinate reference systems through PROJ: projectors for meshes, CF grid-mapping attributes and WKT for products.
#pragma once
#include <string>
#include <utility>
#include <variant>
#include <vector>

#include "windrow/mesh/projector.h"

namespace windrow::geo {

struct GridMapping {
  std::string name;  ///< CF grid_mapping_name; empty when CF has none for this projection (crs_wkt alone is written)
  std::vector<std::pair<std::string, std::variant<std::string, double, std::vector<double>>>> attributes;
};

std::string library_version();  ///< "PROJ 9.1.1, GDAL 3.6.2"

/// A projected or geographic CRS. Geodetic latitude and longitude are those of its own base CRS: no datum shift.
struct Crs {
  std::string definition;  ///< as given
  std::string wkt;         ///< WKT2:2019, one line
  std::string name;
  bool projected = false;
  std::string units;  ///< axis units of a projected CRS as UDUNITS names them ("m"); "degrees" otherwise
  double semi_major_m = 0;
  double inverse_flattening = 0;  ///< 0: sphere
  GridMapping grid_mapping;
  mesh::Projector to_geographic;  ///< x, y -> degrees east of Greenwich, degrees north
  mesh::Projector from_geographic;
};

/// `definition`: AUTHORITY:CODE, PROJ string, WKT, PROJJSON or OGC URN; bare names are refused, since PROJ would take
/// the nearest. Error(job) at `place` when PROJ does not know it or it is no 2-D horizontal CRS with axes to east and
/// north. Network access is off.
Crs make_crs(const std::string& definition, const std::string& place);

/// The CRS of a file's grid mapping (CF 1.13 appendix F): from its single attributes, or from `crs_wkt` where those name
/// no mapping PROJ can express or lack something; both given and over 1 m apart on the ground is Error(data) naming what
/// differs. Its projectors take coordinates in `axis_units` ("m", "km", "radian" of a geostationary scan angle, ...); a
/// rotated pole is no projection: degrees. False origins and scale factors left out are 0 and 1; nothing else is guessed.
/// Error(data) at `place`: unknown mapping, an attribute missing or not a number, no earth's shape (what to add is said).
Crs crs_from_mapping(const GridMapping& mapping, const std::string& axis_units, const std::string& place);
/// The same for a CRS given as text; Error(job) where make_crs says so.
Crs crs_with_units(const std::string& definition, const std::string& axis_units, const std::string& place);

}  // namespace windrow::geo
