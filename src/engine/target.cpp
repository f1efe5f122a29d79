#include "target.h"

#include <fmt/format.h>

#include "windrow/base/constants.h"
#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

// WGS84, the ellipsoid of `earth = "ellipsoid"` on a latlon mesh (EPSG dataset, ellipsoid 7030).
constexpr double kWgs84SemiMajor_m = 6378137.0, kWgs84InverseFlattening = 298.257223563;

mesh::Earth earth_of(const job::MeshSpec& spec, const geo::Crs& crs) {
  if (spec.ellipsoid && crs.inverse_flattening > 0) {
    return mesh::Earth::ellipsoid(crs.semi_major_m, crs.inverse_flattening);
  }
  return mesh::Earth::sphere(crs.inverse_flattening == 0 ? crs.semi_major_m : kEarthRadius_m);
}

Target make(const job::MeshSpec& spec) {
  const std::string& place = spec.place;
  Target out;
  out.x_edges = spec.x.edges();
  out.y_edges = spec.y.edges();
  out.nx = out.x_edges.size() - 1;
  out.ny = out.y_edges.size() - 1;
  out.projected = spec.kind == job::MeshKind::projected;
  if (out.projected) {
    out.crs = geo::make_crs(spec.crs, place);
    if (!out.crs.projected) {
      throw Error(Failure::job, place, fmt::format("crs '{}' is geographic; a projected mesh needs a projected CRS",
                                                   spec.crs));
    }
    out.earth = earth_of(spec, out.crs);
    out.mesh = mesh::make_projected(out.x_edges, out.y_edges, out.crs.to_geographic, out.crs.from_geographic, out.earth,
                                    out.crs.wkt, place);
    return out;
  }
  const std::string definition =
      spec.ellipsoid ? fmt::format("+proj=longlat +a={} +rf={} +no_defs +type=crs", kWgs84SemiMajor_m,
                                   kWgs84InverseFlattening)
                     : fmt::format("+proj=longlat +R={} +no_defs +type=crs", kEarthRadius_m);
  out.crs = geo::make_crs(definition, place);
  out.earth = earth_of(spec, out.crs);
  out.mesh = mesh::make_latlon({out.x_edges, out.y_edges}, out.earth, place);
  return out;
}

}  // namespace

Target make_target(const job::MeshSpec& spec) {
  try {
    return make(spec);
  } catch (const Error& error) {
    if (error.kind() == Failure::defect) throw;
    // The mesh is the job's own: what is wrong with it is wrong in the job file.
    throw Error(Failure::job, "", error.what(), spec.excerpt);
  }
}

}  // namespace windrow::engine
