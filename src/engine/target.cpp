#include "target.h"

#include <fmt/format.h>

#include "source.h"
#include "windrow/base/constants.h"
#include "windrow/base/error.h"
#include "windrow/geo/polygons.h"
#include "windrow/os/files.h"
#include "windrow/station/station.h"

namespace windrow::engine {
namespace {

// WGS84, the ellipsoid of `earth = "ellipsoid"` on a mesh without a CRS of its own (EPSG dataset, ellipsoid 7030).
constexpr double kWgs84SemiMajor_m = 6378137.0, kWgs84InverseFlattening = 298.257223563;
// A cell belongs to the mask when at least this share of it lies within.
constexpr double kWithin = 0.5;

mesh::Earth earth_of(const job::MeshSpec& spec, const geo::Crs& crs) {
  if (spec.ellipsoid && crs.inverse_flattening > 0) {
    return mesh::Earth::ellipsoid(crs.semi_major_m, crs.inverse_flattening);
  }
  return mesh::Earth::sphere(crs.inverse_flattening == 0 ? crs.semi_major_m : kEarthRadius_m);
}

geo::Crs geographic(const job::MeshSpec& spec) {
  return geo::make_crs(spec.ellipsoid ? fmt::format("+proj=longlat +a={} +rf={} +no_defs +type=crs", kWgs84SemiMajor_m,
                                                    kWgs84InverseFlattening)
                                      : fmt::format("+proj=longlat +R={} +no_defs +type=crs", kEarthRadius_m),
                       spec.place);
}

void of_axes(const job::MeshSpec& spec, Target& out) {
  out.x_edges = spec.x.edges();
  out.y_edges = spec.y.edges();
  if (spec.kind == job::MeshKind::latlon) {
    out.crs = geographic(spec);
    out.earth = earth_of(spec, out.crs);
    out.mesh = mesh::make_latlon({out.x_edges, out.y_edges}, out.earth, spec.place);
    return;
  }
  out.layout = MeshLayout::projected;
  out.crs = geo::make_crs(spec.crs, spec.place);
  if (!out.crs.projected) {
    throw Error(Failure::job, spec.place,
                fmt::format("crs '{}' is geographic; a projected mesh needs a projected CRS", spec.crs));
  }
  out.earth = earth_of(spec, out.crs);
  out.mesh = mesh::make_projected(out.x_edges, out.y_edges, out.crs.to_geographic, out.crs.from_geographic, out.earth,
                                  out.crs.wkt, spec.place);
}

void of_raster(const job::MeshSpec& spec, Target& out) {
  Notices notices;
  const geo::Raster raster = geo::read_raster(spec.source, spec.source);
  out.x_edges = raster.x_edges;
  out.y_edges = raster.y_edges;
  const geo::Crs own = geo::make_crs(raster.crs_wkt.empty() ? "OGC:CRS84" : raster.crs_wkt, spec.source);
  out.layout = own.projected ? MeshLayout::projected : MeshLayout::latlon;
  out.crs = own.projected ? own : geographic(spec);
  out.earth = earth_of(spec, out.crs);
  out.mesh = raster_mesh(spec.source, raster, out.earth, notices).mesh;
  out.notices = notices.list();
}

MeshLayout layout_of(const cf::Grid& grid) {
  switch (grid.kind) {
    case cf::GridKind::latlon:
      return MeshLayout::latlon;
    case cf::GridKind::rotated:
      return MeshLayout::rotated;
    case cf::GridKind::projected:
      return MeshLayout::projected;
    case cf::GridKind::cells:
      return grid.corners.ny > 1 ? MeshLayout::curvilinear : MeshLayout::listed;
    case cf::GridKind::healpix:
      return MeshLayout::healpix;
    case cf::GridKind::faces:
      return MeshLayout::faces;
    case cf::GridKind::points:
      break;
  }
  return MeshLayout::listed;
}

std::string variable_with_grid(const job::MeshSpec& spec) {
  if (!spec.variable.empty()) return spec.variable;
  const auto names = cf::data_variables(spec.source);
  if (names.empty()) throw Error(Failure::data, spec.source, "holds no data variable whose grid could be taken");
  return names.front();
}

void of_file(const job::MeshSpec& spec, Target& out) {
  if (!os::state(spec.source)) throw Error(Failure::missing, spec.source, "no such file");
  Notices notices;
  const auto variable = cf::open_run({spec.source}, variable_with_grid(spec), notices);
  out.grid = variable->grid();
  if (out.grid.kind == cf::GridKind::points) {
    throw Error(Failure::data, spec.source, "holds points, no cells; expected a grid, or mesh kind \"towns\"");
  }
  if (spec.kind == job::MeshKind::faces && out.grid.kind != cf::GridKind::faces) {
    throw Error(Failure::data, spec.source, "holds no UGRID faces; expected a mesh topology, or mesh kind \"file\"");
  }
  out.layout = out.grid.subset.empty() ? layout_of(out.grid) : MeshLayout::listed;
  out.crs = geographic(spec);
  out.earth = earth_of(spec, out.crs);
  auto made = mesh_of(out.grid, out.earth, spec.source, notices);
  out.mesh = made.mesh;
  if (out.layout == MeshLayout::projected) {
    out.crs = *made.crs;
    out.x_edges = out.grid.x_edges;
    out.y_edges = out.grid.y_edges;
  } else if (out.layout == MeshLayout::latlon || out.layout == MeshLayout::rotated) {
    out.x_edges = out.grid.edges.lon_deg;
    out.y_edges = out.grid.edges.lat_deg;
  }
  out.notices = notices.list();
}

void to_geographic(const geo::Crs& crs, std::vector<mesh::PolygonCell>& cells) {
  for (auto& cell : cells) {
    for (auto& part : cell.parts) {
      for (auto& ring : part) {
        std::vector<double> x, y;
        for (const auto& point : ring) {
          x.push_back(point[0]);
          y.push_back(point[1]);
        }
        crs.to_geographic(x, y);
        for (std::size_t k = 0; k < ring.size(); ++k) ring[k] = {x[k], y[k]};
      }
    }
  }
}

/// Polygons of a file as a mesh; a layer without a CRS is read as degrees.
mesh::MeshPtr polygon_mesh(const std::string& path, geo::PolygonLayer& layer, const mesh::Earth& earth,
                           Notices& notices) {
  if (layer.crs_wkt.empty()) notices.add(path, "has no CRS; read as longitude and latitude in degrees");
  if (layer.dropped_rings > 0) {
    notices.add(path, fmt::format("{} ring{} of fewer than three different points left out: they bound no area",
                                  layer.dropped_rings, layer.dropped_rings == 1 ? "" : "s"));
  }
  const geo::Crs crs = geo::make_crs(layer.crs_wkt.empty() ? "OGC:CRS84" : layer.crs_wkt, path);
  const mesh::Projector same = [](std::vector<double>&, std::vector<double>&) {};
  auto out = mesh::make_polygons(layer.cells, layer.ids, crs.projected ? crs.to_geographic : same, earth,
                                 crs.projected ? crs.wkt : "geographic", path);
  if (crs.projected) to_geographic(crs, layer.cells);
  return out;
}

void of_catchments(const job::MeshSpec& spec, Target& out) {
  Notices notices;
  auto layer = geo::read_polygons(spec.source, spec.layer, spec.id, spec.source);
  out.layout = MeshLayout::catchments;
  out.crs = geographic(spec);
  out.earth = earth_of(spec, out.crs);
  out.mesh = polygon_mesh(spec.source, layer, out.earth, notices);
  out.ids = std::move(layer.ids);
  out.polygons = std::move(layer.cells);
  out.notices = notices.list();
}

void of_towns(const job::JobSpec& job, Target& out) {
  const auto& spec = job.mesh;
  Notices notices;
  out.layout = MeshLayout::towns;
  out.crs = geographic(spec);
  out.earth = earth_of(spec, out.crs);
  const auto table = text::CsvTable::parse(os::read_text(spec.source), spec.source);
  const auto sites = station::read_sites(table, {job.stations.columns, job.stations.units}, notices);
  if (sites.empty()) throw Error(Failure::data, spec.source, "names no town with coordinates");
  std::vector<GeoPoint> points;
  for (const auto& site : sites) {
    out.ids.push_back(site.id);
    out.names.push_back(site.name);
    out.elevation.push_back(site.elevation_m);
    points.push_back(site.position);
  }
  out.mesh = mesh::make_points(std::move(points), out.earth);
  out.notices = notices.list();
}

/// Cells less than half of which lie within the mask's polygons, or where its raster is neither zero nor missing.
std::vector<bool> outside_mask(const std::string& path, const Target& target, MapStore& maps, Notices& notices) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file");
  std::vector<double> within;
  if (geo::looks_like_vector(path)) {
    auto layer = geo::read_polygons(path, "", "", path);
    const auto mesh = polygon_mesh(path, layer, target.earth, notices);
    const auto map = maps.conservative(*target.mesh, *mesh, linear_map::Quantity::total);
    within = linear_map::column_overlap(*map);
    for (std::size_t k = 0; k < within.size(); ++k) within[k] /= target.mesh->area(k);
  } else {
    FixedField field = read_mask(path, target.earth, notices);
    for (double& x : field.values) x = std::isnan(x) || x == 0 ? 0 : 1;
    std::vector<double> cover;
    within = onto_mesh(field, *target.mesh, maps, &cover);
    for (std::size_t k = 0; k < within.size(); ++k) within[k] *= cover[k];
  }
  std::vector<bool> out(within.size());
  bool any = false;
  for (std::size_t k = 0; k < within.size(); ++k) {
    out[k] = !(within[k] >= kWithin);
    any = any || !out[k];
  }
  if (!any) throw Error(Failure::data, path, "the mask leaves no cell of the mesh");
  return out;
}

Target make(const job::JobSpec& job, MapStore& maps) {
  Target out;
  switch (job.mesh.kind) {
    case job::MeshKind::latlon:
    case job::MeshKind::projected:
      of_axes(job.mesh, out);
      break;
    case job::MeshKind::raster:
      of_raster(job.mesh, out);
      break;
    case job::MeshKind::file:
    case job::MeshKind::faces:
      of_file(job.mesh, out);
      break;
    case job::MeshKind::catchments:
      of_catchments(job.mesh, out);
      break;
    case job::MeshKind::towns:
      of_towns(job, out);
      break;
  }
  std::tie(out.ny, out.nx) = out.mesh->shape();
  if (!job.mesh.mask.empty()) {
    Notices notices;
    out.outside = outside_mask(job.mesh.mask, out, maps, notices);
    for (const auto& notice : notices.list()) out.notices.push_back(notice);
  }
  return out;
}

}  // namespace

Target make_target(const job::JobSpec& job, MapStore& maps) {
  try {
    return make(job, maps);
  } catch (const Error& error) {
    const bool own = job.mesh.kind == job::MeshKind::latlon || job.mesh.kind == job::MeshKind::projected;
    if (!own || error.kind() == Failure::defect || error.kind() == Failure::missing) throw;
    if (!job.mesh.mask.empty() && std::string(error.what()).starts_with(job.mesh.mask)) throw;
    // The mesh is the job's own: what is wrong with it is wrong in the job file.
    throw Error(Failure::job, "", error.what(), job.mesh.excerpt);
  }
}

std::vector<std::string> mesh_files(const job::MeshSpec& spec) {
  std::vector<std::string> out;
  for (const auto* path : {&spec.source, &spec.mask}) {
    if (!path->empty()) out.push_back(*path);
  }
  return out;
}

}  // namespace windrow::engine
