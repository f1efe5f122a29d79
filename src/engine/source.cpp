#include "source.h"

#include <fmt/format.h>

#include <algorithm>
#include <numeric>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/geo/crs.h"
#include "windrow/geo/raster.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/os/files.h"
#include "windrow/overlap/overlap.h"
#include "windrow/text/words.h"
#include "windrow/units/units.h"

namespace windrow::engine {
namespace {

// Part of every map's name: a change of the geometry code that changes shares must change it.
constexpr const char* kMapFormat = "conservative-1 map, format 1";

std::string only_variable(const std::string& path, const std::string& standard_name, Notices& notices) {
  const auto names = cf::data_variables(path);
  if (names.size() == 1) return names.front();
  std::vector<std::string> fitting;
  for (const auto& name : names) {
    if (cf::open_run({path}, name, notices)->info().standard_name == standard_name) fitting.push_back(name);
  }
  if (fitting.size() == 1) return fitting.front();
  throw Error(Failure::data, path, fmt::format("holds {} variables and not exactly one with standard_name {}; expected "
                                               "a file with one field", names.size(), standard_name));
}

}  // namespace

Source open_source(const std::vector<std::string>& files, const std::string& variable, const mesh::Earth& earth,
                   Notices& notices) {
  Source out;
  out.variable = cf::open_run(files, variable, notices);
  out.mesh = mesh::make_latlon(out.variable->grid().edges, earth, files.front());
  return out;
}

FixedField read_fixed(const std::string& path, const std::string& standard_name, const std::string& units,
                      const mesh::Earth& earth, Notices& notices) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file");
  FixedField out;
  out.variable = only_variable(path, standard_name, notices);
  const auto source = open_source({path}, out.variable, earth, notices);
  if (source.variable->time().size() > 1) {
    throw Error(Failure::data, fmt::format("{}: {}", path, out.variable), "varies in time; expected a fixed field");
  }
  const auto& info = source.variable->info();
  const auto convert = units::conversion(info.units, units, info.standard_name, fmt::format("{}: {}", path, out.variable));
  out.mesh = source.mesh;
  out.units = units;
  std::vector<std::uint32_t> cells(out.mesh->size());
  std::iota(cells.begin(), cells.end(), 0U);
  out.values.resize(cells.size());
  source.variable->read(0, 1, cells, out.values.data());
  for (double& x : out.values) x = convert.affine(x);
  return out;
}

FixedField read_height(const std::string& path, const mesh::Earth& earth, Notices& notices) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file");
  if (cf::looks_like_netcdf(path)) return read_fixed(path, "surface_altitude", "m", earth, notices);
  auto raster = geo::read_raster(path, path);
  FixedField out;
  out.variable = "band 1";
  out.units = "m";
  if (raster.crs_wkt.empty()) notices.add(path, "has no CRS; read as longitude and latitude in degrees");
  const geo::Crs crs = geo::make_crs(raster.crs_wkt.empty() ? "OGC:CRS84" : raster.crs_wkt, path);
  if (crs.projected) {
    out.mesh = mesh::make_projected(raster.x_edges, raster.y_edges, crs.to_geographic, crs.from_geographic, earth,
                                    crs.wkt, path);
  } else {
    out.mesh = mesh::make_latlon({raster.x_edges, raster.y_edges}, earth, path);
  }
  out.values = std::move(raster.values);
  if (!raster.units.empty() && raster.units != "m") {
    const auto convert = units::conversion(raster.units, "m", "surface_altitude", path);
    for (double& x : out.values) x = convert.affine(x);
  }
  return out;
}

MapPtr MapStore::conservative(const mesh::Mesh& source, const mesh::Mesh& target, linear_map::Quantity quantity) {
  const auto key = codec::Hasher()
                       .add(std::string(kMapFormat))
                       .add(source.digest().hex())
                       .add(target.digest().hex())
                       .add(static_cast<std::int64_t>(quantity))
                       .finish()
                       .hex();
  if (const auto found = held_.find(key); found != held_.end()) return found->second;
  auto map = std::make_shared<linear_map::LinearMap>();
  const std::string path = folder_.empty() ? "" : fmt::format("{}/{}.map", folder_, key);
  const bool stored = !path.empty() && os::state(path) && linear_map::parse(os::read_bytes(path), *map);
  if (!stored) {
    auto result = overlap::conservative(source, target, quantity);
    *map = std::move(result.map);
    const auto& closure = result.closure;
    map->provenance += fmt::format("; row sums within {:.2e} (bound there {:.2e}, {} rows), column sums within {:.2e} "
                                   "(bound there {:.2e}, {} columns), before normalising",
                                   closure.worst_row, closure.worst_row_bound, closure.rows_checked,
                                   closure.worst_column, closure.worst_column_bound, closure.columns_checked);
    if (!path.empty()) {
      os::make_folder(folder_);
      os::replace_file(path, linear_map::serialise(*map));
    }
  }
  held_[key] = map;
  return map;
}

std::vector<double> onto_mesh(const FixedField& field, const mesh::Mesh& target, MapStore& maps) {
  const auto map = maps.conservative(*field.mesh, target, linear_map::Quantity::mean);
  const auto weights = linear_map::make_weights(*map, {});
  std::vector<std::uint32_t> all(map->columns);
  std::iota(all.begin(), all.end(), 0U);
  linear_map::SourceBlock block;
  block.resize(all, all.size(), 1);
  block.fill(0, 1, field.values.data());
  std::vector<double> out(map->rows());
  for (std::size_t row = 0; row < out.size(); ++row) {
    linear_map::apply_series(weights, row, block, std::span<double>(&out[row], 1));
  }
  return out;
}

}  // namespace windrow::engine
