// Reading a grid: coordinates, bounds, Gaussian latitudes. The cells themselves are made in axis_cells.
#include "grid.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "axis_cells.h"
#include "windrow/mesh/mesh.h"

namespace windrow::cf {

namespace {

/// Latitudes within this many degrees of the Legendre roots are Gaussian (published tables have four decimals).
constexpr double kGaussianTolerance = 2e-4;

AxisValues read_axis(const nc::File& file, const Header& header, const nc::Var& coordinate, Remarks& remarks) {
  AxisValues values;
  values.place = header.path;
  values.name = coordinate.name;
  values.centres = coordinate_values(file, coordinate);
  values.single_precision = coordinate.type == NC_FLOAT;
  values.bounds_name = coordinate.text("bounds");
  if (values.bounds_name.empty()) return values;
  const nc::Var* bounds = header.find(values.bounds_name);
  if (bounds == nullptr) {
    remarks.push_back(fmt::format("bounds '{}' of '{}' are not in the file", values.bounds_name, coordinate.name));
  } else if (bounds->dims.size() != 2 || bounds->dims[0] != coordinate.dims[0] ||
             header.dim(bounds->dims[1]).length != 2) {
    remarks.push_back(fmt::format("bounds '{}' have the shape {}, ({}, 2) was expected; they are not used",
                                  values.bounds_name, header.shape_text(*bounds), header.dim(coordinate.dims[0]).name));
  } else {
    values.bounds = coordinate_values(file, *bounds, &coordinate);
  }
  return values;
}

/// Number of latitudes, pole to pole, of the Gaussian grid these rows belong to; 0 when they belong to none.
/// `first` becomes the row (from the south) of the lowest one.
std::size_t gaussian_rows(const AxisCells& cells, std::size_t& first) {
  const std::vector<double>& centres = cells.centres;
  if (cells.step > 0 || centres.size() < 4) return 0;
  if (mesh::is_gaussian(centres)) {
    first = 0;
    return centres.size();
  }
  const double spacing = (centres.back() - centres.front()) / double(centres.size() - 1);
  const auto guess = std::ptrdiff_t(std::lround(180 / spacing));
  for (std::ptrdiff_t count = std::max<std::ptrdiff_t>(guess - 3, std::ptrdiff_t(centres.size())); count <= guess + 3;
       ++count) {
    if (count % 2 != 0 || count > 8000) continue;
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

std::string extent_text(const mesh::LatLonEdges& edges) {
  const bool round = edges.lon_deg.back() - edges.lon_deg.front() == 360;
  if (round && edges.lat_deg.front() == -90 && edges.lat_deg.back() == 90) return "global";
  return fmt::format("{:g} .. {:g} E, {:g} .. {:g} N", edges.lon_deg.front(), edges.lon_deg.back(),
                     edges.lat_deg.front(), edges.lat_deg.back());
}

std::string edges_text(const AxisCells& lat, const AxisCells& lon, bool weights) {
  const std::string inferred_lat = weights ? "from quadrature weights" : "half-way between centres";
  if (lat.from_bounds && lon.from_bounds) return "edges from the file's bounds";
  if (!lat.from_bounds && !lon.from_bounds)
    return fmt::format("edges {} (no bounds in the file)",
                       weights ? "from quadrature weights in latitude, half-way between centres in longitude"
                               : "half-way between centres");
  return lat.from_bounds
             ? "edges from the file's bounds in latitude, half-way between centres in longitude (no bounds there)"
             : fmt::format("edges from the file's bounds in longitude, {} in latitude (no bounds there)", inferred_lat);
}

}  // namespace

FileGrid read_grid(const nc::File& file, const Header& header, const Layout& layout, Remarks& remarks) {
  AxisCells lat = latitude_cells(read_axis(file, header, *layout.latitude_values, remarks), remarks);
  AxisCells lon = longitude_cells(read_axis(file, header, *layout.longitude_values, remarks), remarks);

  std::size_t first = 0;
  const std::size_t rows = gaussian_rows(lat, first);
  const bool weights = rows > 0 && !lat.from_bounds;
  if (weights) {
    const std::vector<double> all = mesh::gaussian_edges_deg(rows);
    const auto begin = all.begin() + std::ptrdiff_t(first);
    lat.edges.assign(begin, begin + std::ptrdiff_t(lat.index.size() + 1));
    std::erase_if(remarks, [&](const std::string& text) { return text.starts_with("the outermost row of '"); });
  }

  FileGrid result;
  result.grid.edges = {lon.edges, lat.edges};
  result.grid.gaussian = rows > 0;
  std::string kind = "irregular latitude-longitude";
  if (rows > 0)
    kind = fmt::format("Gaussian N{}", rows / 2);
  else if (lat.step > 0 && lon.step > 0)
    kind = fmt::format("regular latitude-longitude, {:.6g} x {:.6g} degrees", lat.step, lon.step);
  result.grid.how = fmt::format("{}, {} x {} cells, {}, {}", kind, lat.index.size(), lon.index.size(),
                                extent_text(result.grid.edges), edges_text(lat, lon, weights));
  result.latitude_index = std::move(lat.index);
  result.longitude_index = std::move(lon.index);
  return result;
}

}  // namespace windrow::cf
