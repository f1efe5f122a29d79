// Latitude-longitude grids: coordinates, bounds, Gaussian latitudes. The cells themselves are made in axis_cells.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "grid.h"
#include "windrow/mesh/mesh.h"

namespace windrow::cf {

namespace {

/// Latitudes within this many degrees of the Legendre roots are Gaussian (published tables have four decimals).
constexpr double kGaussianTolerance = 2e-4;
/// No Gaussian grid has more latitudes, pole to pole.
constexpr int kMostRows = 8000;
/// Two-dimensional coordinates within this many degrees of one-dimensional ones say the same.
constexpr double kSamePlace = 2e-3;

bool is_globe_axis(Role role) {
  return role == Role::latitude || role == Role::longitude || role == Role::grid_latitude ||
         role == Role::grid_longitude;
}

/// The older attribute `edges`: n + 1 values along a dimension of their own.
void read_edges(const Context& context, const nc::Var& coordinate, const nc::Var& edges, AxisValues& values) {
  const std::size_t count = values.centres.size();
  if (edges.dims.size() != 1 || context.header().dim(edges.dims[0]).length != count + 1) {
    context.remarks.push_back(fmt::format("edges '{}' have the shape {}, {} values were expected; they are not used",
                                          edges.name, context.header().shape_text(edges), count + 1));
    return;
  }
  const std::vector<double> list = context.inputs.values(edges, &coordinate);
  for (std::size_t i = 0; i < count; ++i) values.bounds.insert(values.bounds.end(), {list[i], list[i + 1]});
}

std::string extent_text(const mesh::LatLonEdges& edges) {
  const bool round = edges.lon_deg.back() - edges.lon_deg.front() == 360;
  if (round && edges.lat_deg.front() == -90 && edges.lat_deg.back() == 90) return "global";
  return fmt::format("{:g} .. {:g} E, {:g} .. {:g} N", edges.lon_deg.front(), edges.lon_deg.back(),
                     edges.lat_deg.front(), edges.lat_deg.back());
}

/// Do two-dimensional coordinates, where the variable names them, stand elsewhere than the axes? Then the axes are only
/// nominal, as ocean models write them.
bool only_nominal(const Context& context, const Axis& lat, const Axis& lon, const AxisValues& lat_values,
                  const AxisValues& lon_values) {
  const auto pair = latlon_pair(context, 2);
  const std::vector<std::string> listed = words(context.variable.text("coordinates"));
  if (!pair || std::ranges::find(listed, pair->latitude->name) == listed.end()) return false;
  const std::vector<int> dims = {lat.dim->id, lon.dim->id};
  const std::vector<double> phi = context.inputs.over(*pair->latitude, dims);
  const std::vector<double> lambda = context.inputs.over(*pair->longitude, dims);
  const std::size_t nx = lon.dim->length;
  for (std::size_t i = 0; i < phi.size(); ++i) {
    if (std::isnan(phi[i]) || std::isnan(lambda[i])) continue;
    const double off = std::remainder(lambda[i] - lon_values.centres[i % nx], 360);
    if (std::abs(phi[i] - lat_values.centres[i / nx]) < kSamePlace && std::abs(off) < kSamePlace) continue;
    context.remarks.push_back(
        fmt::format("its axes '{}' and '{}' are only nominal: '{}' and '{}', which it names as coordinates, stand "
                    "elsewhere and are used",
                    lat.values->name, lon.values->name, pair->latitude->name, pair->longitude->name));
    return true;
  }
  return false;
}

}  // namespace

AxisValues read_axis(const Context& context, const nc::Var& coordinate) {
  const Header& header = context.header();
  AxisValues values;
  values.place = context.inputs.place(coordinate);
  values.name = coordinate.name;
  values.centres = context.inputs.values(coordinate);
  values.single_precision = coordinate.type == NC_FLOAT;
  values.bounds_name = coordinate.text("bounds");
  const bool edges = values.bounds_name.empty() && !coordinate.text("edges").empty();
  if (edges) values.bounds_name = coordinate.text("edges");
  if (!values.bounds_name.empty()) {
    const nc::Var* bounds = header.find(values.bounds_name);
    const std::size_t count = values.centres.size();
    if (bounds == nullptr) {
      context.remarks.push_back(
          fmt::format("bounds '{}' of '{}' are not in the file", values.bounds_name, coordinate.name));
    } else if (edges) {
      read_edges(context, coordinate, *bounds, values);
    } else if (bounds->dims.size() != 2 || bounds->dims[0] != coordinate.dims[0] ||
               header.dim(bounds->dims[1]).length != 2) {
      context.remarks.push_back(fmt::format("bounds '{}' have the shape {}, ({}, 2) was expected; they are not used",
                                            values.bounds_name, header.shape_text(*bounds),
                                            header.dim(coordinate.dims[0]).name));
    } else {
      values.bounds = context.inputs.values(*bounds, &coordinate);
      values.bounds.resize(2 * count);
    }
  }
  if (is_radian(coordinate.text("units")) && is_globe_axis(role_of(coordinate)))
    for (std::vector<double>* list : {&values.centres, &values.bounds})
      for (double& value : *list) value *= 180 / std::numbers::pi;
  return values;
}

std::size_t gaussian_rows(const AxisCells& cells, std::size_t& first) {
  const std::vector<double>& centres = cells.centres;
  first = 0;
  if (cells.step > 0 || centres.size() < 4) return 0;
  const double spacing = (centres.back() - centres.front()) / double(centres.size() - 1);
  if (spacing < 180.0 / kMostRows) return 0;
  if (mesh::is_gaussian(centres)) return centres.size();
  const auto guess = std::ptrdiff_t(std::lround(180 / spacing));
  for (std::ptrdiff_t count = std::max<std::ptrdiff_t>(guess - 3, std::ptrdiff_t(centres.size())); count <= guess + 3;
       ++count) {
    if (count % 2 != 0 || count > kMostRows) continue;
    const std::vector<double> all = mesh::gaussian_latitudes_deg(count);
    const auto start = std::ranges::lower_bound(all, centres.front() - kGaussianTolerance) - all.begin();
    if (start + std::ptrdiff_t(centres.size()) > count) continue;
    bool alike = true;
    for (std::size_t i = 0; alike && i < centres.size(); ++i)
      alike = std::abs(all[start + i] - centres[i]) <= kGaussianTolerance;
    if (alike) {
      first = start;
      return count;
    }
  }
  return 0;
}

std::string edges_text(const AxisCells& y, const AxisCells& x, bool weights, const char* y_name, const char* x_name) {
  const std::string half_way = "half-way between centres", along_y = weights ? "from quadrature weights" : half_way;
  if (y.from_bounds && x.from_bounds) return "edges from the file's bounds";
  if (!y.from_bounds && !x.from_bounds)
    return fmt::format("edges {} (no bounds in the file)",
                       weights ? fmt::format("{} in {}, {} in {}", along_y, y_name, half_way, x_name) : half_way);
  return y.from_bounds
             ? fmt::format("edges from the file's bounds in {}, {} in {} (no bounds there)", y_name, half_way, x_name)
             : fmt::format("edges from the file's bounds in {}, {} in {} (no bounds there)", x_name, along_y, y_name);
}

std::size_t use_quadrature_edges(AxisCells& latitudes, Remarks& remarks) {
  std::size_t first = 0;
  const std::size_t rows = gaussian_rows(latitudes, first);
  if (rows == 0 || latitudes.from_bounds) return rows;
  const std::vector<double> all = mesh::gaussian_edges_deg(rows);
  const auto begin = all.begin() + std::ptrdiff_t(first);
  latitudes.edges.assign(begin, begin + std::ptrdiff_t(latitudes.index.size() + 1));
  std::erase_if(remarks, [&](const std::string& text) { return text.starts_with("the outermost row of '"); });
  return rows;
}

std::optional<FileGrid> find_latlon(const Context& context) {
  const Axis* lat_axis = context.axis(Role::latitude);
  const Axis* lon_axis = context.axis(Role::longitude);
  if (lat_axis == nullptr || lon_axis == nullptr) return std::nullopt;
  if (lat_axis->dim->length == 0 || lon_axis->dim->length == 0)
    context.fail(fmt::format("dimension '{}' is empty", (lat_axis->dim->length == 0 ? lat_axis : lon_axis)->dim->name));
  const AxisValues lat_values = read_axis(context, *lat_axis->values),
                   lon_values = read_axis(context, *lon_axis->values);
  const bool single = lat_values.centres.size() == 1 && lon_values.centres.size() == 1;
  if (single && lat_values.bounds.empty() && lon_values.bounds.empty()) return std::nullopt;  // a point
  if (only_nominal(context, *lat_axis, *lon_axis, lat_values, lon_values)) return std::nullopt;
  AxisCells lat = latitude_cells(lat_values, context.remarks);
  AxisCells lon = longitude_cells(lon_values, context.remarks);
  const std::size_t rows = use_quadrature_edges(lat, context.remarks);

  FileGrid result;
  result.grid.edges = {lon.edges, lat.edges};
  result.grid.gaussian = rows > 0;
  std::string kind = "irregular latitude-longitude";
  if (rows > 0)
    kind = fmt::format("Gaussian N{}", rows / 2);
  else if (lat.step > 0 && lon.step > 0)
    kind = fmt::format("regular latitude-longitude, {:.6g} x {:.6g} degrees", lat.step, lon.step);
  result.grid.how = fmt::format("{}, {} x {} cells, {}, {}", kind, lat.index.size(), lon.index.size(),
                                extent_text(result.grid.edges), edges_text(lat, lon, rows > 0 && !lat.from_bounds));
  result.grid.why =
      fmt::format("coordinate variables {} and {}", evidence(*lat_axis->values), evidence(*lon_axis->values));
  result.grid.mapping = mapping_records(context.mapping);
  result.dims = {lat_axis->dim->id, lon_axis->dim->id};
  result.places = {std::move(lat.index), std::move(lon.index), {}, lon_axis->dim->length};
  return result;
}

}  // namespace windrow::cf
