#include "source.h"

#include <fmt/format.h>

#include <numeric>

#include "windrow/base/error.h"
#include "windrow/geo/crs.h"
#include "windrow/geo/raster.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/os/files.h"
#include "windrow/text/words.h"
#include "windrow/units/units.h"

namespace windrow::engine {
namespace {

std::string only_variable(const std::string& path, const std::string& standard_name, Notices& notices,
                          const cf::GridHints& hints) {
  const auto names = cf::data_variables(path);
  if (names.size() == 1) return names.front();
  std::vector<std::string> fitting;
  for (const auto& name : names) {
    if (cf::open_run({path}, name, notices, hints)->info().standard_name == standard_name) fitting.push_back(name);
  }
  if (fitting.size() == 1) return fitting.front();
  throw Error(Failure::data, path,
              fmt::format("holds {} variables and not exactly one with standard_name {}; expected "
                          "a file with one field",
                          names.size(), standard_name));
}

}  // namespace

Source open_source(const std::vector<std::string>& files, const std::string& variable, const mesh::Earth& earth,
                   Notices& notices, const cf::GridHints& hints) {
  Source out;
  out.variable = cf::open_run(files, variable, notices, hints);
  out.mesh = mesh_of(out.variable->grid(), earth, files.front(), notices).mesh;
  return out;
}

FixedField read_fixed(const std::string& path, const std::string& standard_name, const std::string& units,
                      const mesh::Earth& earth, Notices& notices, const cf::GridHints& hints) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file");
  FixedField out;
  out.variable = only_variable(path, standard_name, notices, hints);
  const auto source = open_source({path}, out.variable, earth, notices, hints);
  if (source.variable->time().size() > 1) {
    throw Error(Failure::data, fmt::format("{}: {}", path, out.variable), "varies in time; expected a fixed field");
  }
  const auto& info = source.variable->info();
  const auto convert =
      units::conversion(info.units, units, info.standard_name, fmt::format("{}: {}", path, out.variable));
  out.mesh = source.mesh;
  out.units = units;
  std::vector<std::uint32_t> cells(out.mesh->size());
  std::iota(cells.begin(), cells.end(), 0U);
  out.values.resize(cells.size());
  source.variable->read(0, 1, cells, out.values.data());
  for (double& x : out.values) x = convert.affine(x);
  return out;
}

GridMesh raster_mesh(const std::string& path, const geo::Raster& raster, const mesh::Earth& earth, Notices& notices) {
  GridMesh out;
  if (raster.crs_wkt.empty()) notices.add(path, "has no CRS; read as longitude and latitude in degrees");
  out.crs = geo::make_crs(raster.crs_wkt.empty() ? "OGC:CRS84" : raster.crs_wkt, path);
  if (out.crs->projected) {
    out.mesh = mesh::make_projected(raster.x_edges, raster.y_edges, out.crs->to_geographic, out.crs->from_geographic,
                                    earth, out.crs->wkt, path);
  } else {
    out.mesh = mesh::make_latlon({raster.x_edges, raster.y_edges}, earth, path);
  }
  return out;
}

FixedField read_height(const std::string& path, const mesh::Earth& earth, Notices& notices,
                       const cf::GridHints& hints) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file");
  if (cf::looks_like_netcdf(path)) return read_fixed(path, "surface_altitude", "m", earth, notices, hints);
  auto raster = geo::read_raster(path, path);
  FixedField out;
  out.variable = "band 1";
  out.units = "m";
  out.mesh = raster_mesh(path, raster, earth, notices).mesh;
  out.values = std::move(raster.values);
  if (!raster.units.empty() && raster.units != "m") {
    const auto convert = units::conversion(raster.units, "m", "surface_altitude", path);
    for (double& x : out.values) x = convert.affine(x);
  }
  return out;
}

FixedField read_mask(const std::string& path, const mesh::Earth& earth, Notices& notices) {
  FixedField out;
  if (!cf::looks_like_netcdf(path)) {
    auto raster = geo::read_raster(path, path);
    out.mesh = raster_mesh(path, raster, earth, notices).mesh;
    out.values = std::move(raster.values);
    return out;
  }
  const auto names = cf::data_variables(path);
  if (names.size() != 1) {
    throw Error(Failure::data, path, fmt::format("holds {} variables; expected a mask with one", names.size()));
  }
  const auto source = open_source({path}, names.front(), earth, notices);
  out.mesh = source.mesh;
  std::vector<std::uint32_t> cells(out.mesh->size());
  std::iota(cells.begin(), cells.end(), 0U);
  out.values.resize(cells.size());
  source.variable->read(0, 1, cells, out.values.data());
  return out;
}

std::vector<double> onto_mesh(const FixedField& field, const mesh::Mesh& target, MapStore& maps,
                              std::vector<double>* cover) {
  const auto map = maps.conservative(*field.mesh, target, linear_map::Quantity::mean);
  const auto weights = linear_map::make_weights(*map, {});
  std::vector<std::uint32_t> all(map->columns);
  std::iota(all.begin(), all.end(), 0U);
  linear_map::SourceBlock block;
  block.resize(all, all.size(), 1);
  block.fill(0, 1, field.values.data());
  std::vector<double> out(map->rows());
  if (cover != nullptr) cover->resize(out.size());
  linear_map::RowLanes lanes;
  for (std::size_t row = 0; row < out.size(); ++row) {
    linear_map::apply_row(weights, row, block, 0, lanes);
    out[row] = lanes.value[0];
    if (cover != nullptr) (*cover)[row] = lanes.cover[0];
  }
  return out;
}

}  // namespace windrow::engine
