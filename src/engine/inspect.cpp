// `windrow inspect`: what one file is understood to be.
#include <fmt/format.h>

#include <cmath>
#include <numeric>

#include "calibration.h"
#include "source.h"
#include "windrow/base/error.h"
#include "windrow/cf/stations.h"
#include "windrow/engine/engine.h"
#include "windrow/geo/raster.h"
#include "windrow/os/files.h"
#include "windrow/report/facts.h"
#include "windrow/station/quality.h"
#include "windrow/text/csv.h"

namespace windrow::engine {
namespace {

using report::Fact;

const char* name_of(cf::Frequency frequency) {
  switch (frequency) {
    case cf::Frequency::fixed:
      return "fixed";
    case cf::Frequency::daily:
      return "daily";
    case cf::Frequency::monthly:
      return "monthly";
    case cf::Frequency::other:
      return "other";
  }
  return "";
}

/// Share of missing values, in at most some steps spread over the run.
double missing_share(const Source& source) {
  constexpr std::size_t kMostSteps = 24;
  const std::size_t steps = source.variable->time().size(), stride = std::max<std::size_t>(1, steps / kMostSteps);
  std::vector<std::uint32_t> cells(source.mesh->size());
  std::iota(cells.begin(), cells.end(), 0U);
  std::vector<double> values(cells.size());
  std::size_t missing = 0, seen = 0;
  for (std::size_t t = 0; t < steps; t += stride) {
    source.variable->read(t, t + 1, cells, values.data());
    for (const double x : values) missing += std::isnan(x) ? 1 : 0;
    seen += values.size();
  }
  return static_cast<double>(missing) / static_cast<double>(seen);
}

/// Of a latitude-longitude grid its edges, of any other the extreme centres.
void add_extent(const cf::Grid& grid, const mesh::Mesh& mesh, Fact& fact) {
  if (grid.kind == cf::GridKind::latlon) {
    const auto& edges = grid.edges;
    fact.add({"longitude", fmt::format("{:.4f} to {:.4f}", edges.lon_deg.front(), edges.lon_deg.back())});
    fact.add({"latitude", fmt::format("{:.4f} to {:.4f}", edges.lat_deg.front(), edges.lat_deg.back())});
    return;
  }
  double west = 720, east = -720, south = 90, north = -90;
  for (std::size_t k = 0; k < mesh.size(); ++k) {
    const GeoPoint centre = mesh.centre(k);
    west = std::min(west, centre.longitude.degrees());
    east = std::max(east, centre.longitude.degrees());
    south = std::min(south, centre.latitude.degrees());
    north = std::max(north, centre.latitude.degrees());
  }
  fact.add({"longitude", fmt::format("centres from {:.4f} to {:.4f}", west, east)});
  fact.add({"latitude", fmt::format("centres from {:.4f} to {:.4f}", south, north)});
}

void inspect_variable(const std::string& path, const std::string& name, Fact& fact) {
  Notices notices;
  try {
    const auto source = open_source({path}, name, mesh::Earth{}, notices);
    const auto& variable = *source.variable;
    fact.add({"standard name", variable.info().standard_name});
    fact.add({"units", variable.info().units});
    fact.add({"grid", source.mesh->describe()});
    fact.add({"grid recognised by", variable.grid().how});
    if (!variable.grid().why.empty()) fact.add({"because of", variable.grid().why});
    add_extent(variable.grid(), *source.mesh, fact);
    fact.add({"time step", name_of(variable.frequency())});
    if (variable.frequency() != cf::Frequency::fixed) {
      const auto dates = step_dates(variable);
      fact.add({"calendar", variable.calendar().cf_name()});
      fact.add(
          {"period", fmt::format("{} to {}", calendar::to_string(dates.front()), calendar::to_string(dates.back()))});
      fact.add({"steps", static_cast<std::int64_t>(dates.size())});
    }
    fact.add({"missing share", missing_share(source)});
  } catch (const Error& error) {
    fact.add({"cannot be used", error.what()});
  }
  for (const auto& notice : notices.list()) fact.add({"note", notice.text});
}

/// What the quality checks find in a table of stations; nothing of other tables.
void add_findings(const text::CsvTable& table, Fact& fact) {
  Notices notices;
  station::tell(station::check_table(table), table.file(), notices);
  for (const auto& notice : notices.list()) fact.add({"note", notice.text});
}

void inspect_table(const std::string& path, Fact& root) {
  const auto table = text::CsvTable::parse(os::read_text(path), path);
  root.add({"kind", "table"});
  root.add({"rows", static_cast<std::int64_t>(table.rows())});
  Fact& columns = root.add(Fact("columns"));
  for (const auto& heading : table.headings()) {
    columns.add({heading.name, heading.units.empty() ? "no units in the heading" : heading.units});
  }
  add_findings(table, root);
}

/// A file of observations at stations: the same as of a table, from the table it becomes.
void inspect_stations(const std::string& path, Fact& root) {
  Notices notices;
  Fact& fact = root.add(Fact("stations"));
  try {
    const auto sites = cf::read_station_sites({path}, notices);
    fact.add({"number", static_cast<std::int64_t>(sites.rows())});
    add_findings(sites, fact);
    add_findings(cf::read_station_values(path, cf::StationSpan::day, {}, notices).table, fact);
  } catch (const Error& error) {
    fact.add({"cannot be used as daily observations", error.what()});
  }
  for (const auto& notice : notices.list()) fact.add({"note", notice.text});
}

void inspect_raster(const std::string& path, Fact& root) {
  const auto raster = geo::read_raster(path, path);
  root.add({"kind", "raster"});
  root.add({"cells", fmt::format("{} x {}", raster.y_edges.size() - 1, raster.x_edges.size() - 1)});
  root.add({"x", fmt::format("{} to {}", raster.x_edges.front(), raster.x_edges.back())});
  root.add({"y", fmt::format("{} to {}", raster.y_edges.front(), raster.y_edges.back())});
  root.add({"crs", raster.crs_wkt.empty() ? "none" : geo::make_crs(raster.crs_wkt, path).name});
  root.add({"units", raster.units.empty() ? "none" : raster.units});
}

}  // namespace

Report inspect(const std::string& path) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file");
  Fact root("inspect");
  root.add({"file", path});
  const bool table = path.ends_with(".csv") || path.ends_with(".CSV") || path.ends_with(".txt");
  if (table) {
    inspect_table(path, root);
  } else if (cf::looks_like_netcdf(path)) {
    root.add({"kind", "NetCDF"});
    const auto names = cf::data_variables(path);
    if (names.empty()) throw Error(Failure::data, path, "holds no data variable");
    for (const auto& name : names) inspect_variable(path, name, root.add(Fact(name)));
    if (cf::has_stations(path)) inspect_stations(path, root);
  } else if (geo::looks_like_raster(path)) {
    inspect_raster(path, root);
  } else {
    throw Error(Failure::data, path, "is neither NetCDF nor a raster nor a table (.csv)");
  }
  return {report::to_text(root), report::to_json(root)};
}

}  // namespace windrow::engine
