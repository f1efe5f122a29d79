// Rotated-pole grids: latitude-longitude axes in a turned frame (CF 1.13 section 5.6 and appendix F, "Rotated pole").
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>

#include "grid.h"
#include "windrow/mesh/mesh.h"

namespace windrow::cf {

namespace {

/// Differences between stored and rotated coordinates that are only rounding, as a share of a cell.
constexpr double kCheckShare = 0.1;

/// A number of the mapping variable; text that spells one is met in old files.
std::optional<double> number(const Mapping& mapping, const char* name) {
  const nc::Att* att = mapping.variable != nullptr ? mapping.variable->find(name) : nullptr;
  if (att == nullptr) return std::nullopt;
  if (!att->numbers.empty()) return att->numbers[0];
  char* end = nullptr;
  const double value = std::strtod(att->text.c_str(), &end);
  return end != att->text.c_str() && *end == '\0' ? std::optional(value) : std::nullopt;
}

std::optional<mesh::Rotation> rotation_of(const Context& context) {
  const auto lon = number(context.mapping, "grid_north_pole_longitude");
  const auto lat = number(context.mapping, "grid_north_pole_latitude");
  mesh::Rotation rotation;
  rotation.north_pole_grid_lon_deg = number(context.mapping, "north_pole_grid_longitude").value_or(0);
  if (lon && lat) {
    rotation.pole_lon_deg = *lon;
    rotation.pole_lat_deg = *lat;
    if (context.hints.pole && ((*context.hints.pole)[0] != *lon || (*context.hints.pole)[1] != *lat))
      context.remarks.push_back(
          fmt::format("the rotated pole is the file's ({:g} E, {:g} N), not the job's ({:g} E, "
                      "{:g} N)",
                      *lon, *lat, (*context.hints.pole)[0], (*context.hints.pole)[1]));
  } else if (context.hints.pole) {
    rotation.pole_lon_deg = (*context.hints.pole)[0];
    rotation.pole_lat_deg = (*context.hints.pole)[1];
  } else {
    return std::nullopt;
  }
  const bool sound = std::abs(rotation.pole_lat_deg) <= 90 && std::abs(rotation.pole_lon_deg) <= 720 &&
                     std::abs(rotation.north_pole_grid_lon_deg) <= 720;
  if (!sound)
    context.fail(fmt::format("the rotated pole ({:g} E, {:g} N, meridian {:g}) is not on the globe",
                             rotation.pole_lon_deg, rotation.pole_lat_deg, rotation.north_pole_grid_lon_deg));
  return rotation;
}

/// Says by how much two-dimensional coordinates in the file depart from the rotated axes, where that is no rounding.
void check_coordinates(const Context& context, const FileGrid& grid, const AxisCells& lat, const AxisCells& lon) {
  const auto pair = latlon_pair(context, 2);
  if (!pair) return;
  const std::vector<double> phi = context.inputs.over(*pair->latitude, grid.dims);
  const std::vector<double> lambda = context.inputs.over(*pair->longitude, grid.dims);
  std::vector<double> x, y;
  for (std::size_t j = 0; j < lat.index.size(); ++j)
    for (std::size_t i = 0; i < lon.index.size(); ++i) {
      x.push_back(lon.centres[i]);
      y.push_back(lat.centres[j]);
    }
  mesh::rotated_projector(grid.grid.rotation)(x, y);
  double worst = 0;
  for (std::size_t cell = 0; cell < x.size(); ++cell) {
    const std::size_t at = grid.places.y(cell) * grid.places.width + grid.places.x(cell);
    if (std::isnan(phi[at]) || std::isnan(lambda[at])) continue;
    const double across = std::remainder(lambda[at] - x[cell], 360) * std::cos(y[cell] * M_PI / 180);
    worst = std::max(worst, std::hypot(across, phi[at] - y[cell]));
  }
  const double cell = (lat.edges.back() - lat.edges.front()) / double(lat.index.size());
  if (worst > kCheckShare * cell)
    context.remarks.push_back(
        fmt::format("'{}' and '{}' depart from the rotated axes by up to {:.2g} degrees; the axes "
                    "are used",
                    pair->latitude->name, pair->longitude->name, worst));
}

}  // namespace

std::optional<FileGrid> find_rotated(const Context& context) {
  const Axis* lat_axis = context.axis(Role::grid_latitude);
  const Axis* lon_axis = context.axis(Role::grid_longitude);
  if (lat_axis == nullptr || lon_axis == nullptr) return std::nullopt;
  const std::string axes = fmt::format("'{}' and '{}'", lat_axis->values->name, lon_axis->values->name);
  const auto rotation = rotation_of(context);
  if (!rotation) {
    const std::string what =
        fmt::format("{} are axes of a rotated grid, but no grid mapping says where its pole stands", axes);
    if (!latlon_pair(context, 2)) context.fail(what + "; add grid = { pole = [LONGITUDE, LATITUDE] } to the [[run]]");
    context.remarks.push_back(what + "; its two-dimensional latitudes and longitudes are used");
    return std::nullopt;
  }
  AxisValues lon_values = read_axis(context, *lon_axis->values);
  FileGrid result;
  Grid& grid = result.grid;
  grid.rotation = *rotation;
  // With its pole at the north pole the frame is only turned about it.
  const bool turned = rotation->pole_lat_deg != 90;
  if (!turned) {
    const double shift = std::remainder(rotation->pole_lon_deg + 180 - rotation->north_pole_grid_lon_deg, 360);
    for (std::vector<double>* list : {&lon_values.centres, &lon_values.bounds})
      for (double& value : *list) value += shift;
    grid.rotation = {};
  }
  AxisCells lat = latitude_cells(read_axis(context, *lat_axis->values), context.remarks);
  AxisCells lon = longitude_cells(std::move(lon_values), context.remarks);
  grid.kind = turned ? GridKind::rotated : GridKind::latlon;
  grid.edges = {lon.edges, lat.edges};
  grid.mapping = mapping_records(context.mapping);
  const std::string spacing =
      lat.step > 0 && lon.step > 0 ? fmt::format(", {:.6g} x {:.6g} degrees", lat.step, lon.step) : std::string();
  const std::string pole =
      turned ? fmt::format("rotated pole at {:g} E, {:g} N", rotation->pole_lon_deg, rotation->pole_lat_deg)
             : "latitude-longitude (its rotated pole is the north pole)";
  grid.how = fmt::format("{}{}, {} x {} cells, {:g} .. {:g} and {:g} .. {:g} {}degrees, {}", pole, spacing,
                         lat.index.size(), lon.index.size(), lon.edges.front(), lon.edges.back(), lat.edges.front(),
                         lat.edges.back(), turned ? "rotated " : "", edges_text(lat, lon, false));
  grid.why =
      fmt::format("axes {} and {}, {}", evidence(*lat_axis->values), evidence(*lon_axis->values),
                  context.mapping.kind == Mapping::Kind::rotated ? mapping_text(context.mapping) : "pole from the job");
  result.dims = {lat_axis->dim->id, lon_axis->dim->id};
  result.places = {lat.index, lon.index, {}, lon_axis->dim->length};
  if (turned) check_coordinates(context, result, lat, lon);
  return result;
}

}  // namespace windrow::cf
