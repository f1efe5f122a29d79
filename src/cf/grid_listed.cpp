// Cells along one dimension: with vertex bounds (unstructured models), or the rows of a reduced grid (CF 1.13 example
// 5.3), whose cells follow from their latitudes and longitudes.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "cell_list.h"
#include "reduced_rows.h"

namespace windrow::cf {

namespace {

/// Are all sides of all cells along parallels or meridians?
bool all_sides_latlon(const mesh::CellCorners& corners) {
  const double near = std::max(corners.rounding_deg / 10, 1e-9);
  const std::size_t count = corners.lat_deg.size() / corners.most;
  for (std::size_t cell = 0; cell < count; ++cell) {
    std::size_t own = corners.most;
    const double* lat = corners.lat_deg.data() + cell * corners.most;
    const double* lon = corners.lon_deg.data() + cell * corners.most;
    while (own > 0 && std::isnan(lat[own - 1])) --own;
    for (std::size_t k = 0; k < own; ++k) {
      const std::size_t next = (k + 1) % own;
      const bool pole = std::abs(lat[k]) > 90 - near || std::abs(lat[next]) > 90 - near;
      const bool parallel = std::abs(lat[k] - lat[next]) <= near;
      const bool meridian = std::abs(std::remainder(lon[k] - lon[next], 360)) <= near;
      if (!pole && !parallel && !meridian) return false;
    }
  }
  return true;
}

FileGrid listed(const Context& context, const LatLonPair& pair, mesh::CellCorners corners, bool parallels) {
  FileGrid result;
  result.dims = pair.dims;
  const std::size_t count = corners.centre_lat_deg.size();
  result.places = keep_usable(context, corners, count, 1);
  corners.ny = 1;
  corners.nx = result.places.size();
  result.grid.kind = GridKind::cells;
  result.grid.sides = sides_of(context, parallels);
  result.grid.corners = std::move(corners);
  result.grid.mapping = mapping_records(context.mapping);
  return result;
}

/// The smallest and largest number of corners a cell has: "3 to 6".
std::string corner_counts(const mesh::CellCorners& corners) {
  std::size_t fewest = corners.most, most = 0;
  for (std::size_t cell = 0; cell < corners.nx; ++cell) {
    const auto* first = corners.lat_deg.data() + cell * corners.most;
    const auto own = std::size_t(std::count_if(first, first + corners.most, [](double v) { return !std::isnan(v); }));
    fewest = std::min(fewest, own);
    most = std::max(most, own);
  }
  return fewest == most ? fmt::format("{}", most) : fmt::format("{} to {}", fewest, most);
}

}  // namespace

std::optional<FileGrid> find_listed(const Context& context) {
  const auto pair = latlon_pair(context, 1);
  if (!pair) return std::nullopt;
  if (context.header().dim(pair->dims[0]).length == 0)
    context.fail(fmt::format("dimension '{}' is empty", context.header().dim(pair->dims[0]).name));
  const std::vector<double> lon = read_degrees(context, *pair->longitude, pair->dims);
  const std::vector<double> lat = read_degrees(context, *pair->latitude, pair->dims);
  const std::string why =
      fmt::format("one-dimensional coordinates {} and {} over one dimension '{}'", evidence(*pair->latitude),
                  evidence(*pair->longitude), context.header().dim(pair->dims[0]).name);
  if (auto corners = read_corners(context, *pair, pair->dims)) {
    corners->centre_lon_deg = lon;
    corners->centre_lat_deg = lat;
    const bool parallels = all_sides_latlon(*corners);
    FileGrid result = listed(context, *pair, *std::move(corners), parallels);
    Grid& grid = result.grid;
    grid.how =
        fmt::format("{} cells listed, {} corners each from the file's bounds '{}'{}, {}", grid.corners.nx,
                    corner_counts(grid.corners), pair->latitude->text("bounds"),
                    parallels ? ", all of them latitude-longitude rectangles" : "", sides_text(context, grid.sides));
    grid.why = why + " with vertex bounds";
    return result;
  }
  const bool stations = lower(context.header().text("featureType")) == "timeseries";
  if (stations) return std::nullopt;
  auto rows = reduced_rows(lon, lat, context.header().path);
  if (!rows) return std::nullopt;
  rows->corners.rounding_deg = rounding_of(lat, pair->latitude->type);
  FileGrid result = listed(context, *pair, std::move(rows->corners), true);
  result.grid.gaussian = rows->gaussian > 0;
  result.grid.how = fmt::format(
      "reduced {}, {} cells in {} rows, row edges {}, longitudes half-way within the row (no bounds in the file), {}",
      rows->gaussian > 0 ? fmt::format("Gaussian N{}", rows->gaussian / 2) : "latitude-longitude",
      result.grid.corners.nx, rows->rows, rows->gaussian > 0 ? "from quadrature weights" : "half-way between latitudes",
      sides_text(context, result.grid.sides));
  result.grid.why = why + " in rows of constant latitude";
  return result;
}

}  // namespace windrow::cf
