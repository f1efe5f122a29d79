// Rows of reduced grids. Row edges come from Gaussian quadrature weights where the latitudes are Gaussian, otherwise
// half-way; within a row half-way between longitudes.
#include "reduced_rows.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "grid.h"

namespace windrow::cf {

namespace {

/// A reduced grid has a few points in every row, and several rows; what has fewer are stations.
constexpr std::size_t kFewestRows = 4, kFewestPoints = 3;
/// Sides along parallels get corners in between, so that none is longer than this.
constexpr double kLongestSide_deg = 60;

struct Row {
  double latitude = 0;
  std::size_t first = 0, count = 0;
};

/// Runs of points at one latitude; nothing when one comes back later, or a run is short.
std::optional<std::vector<Row>> runs(const std::vector<double>& lat) {
  std::vector<Row> rows;
  for (std::size_t i = 0; i < lat.size(); ++i) {
    if (rows.empty() || std::abs(lat[i] - rows.back().latitude) > 1e-5) {
      if (!rows.empty() && rows.back().count < kFewestPoints) return std::nullopt;
      rows.push_back({lat[i], i, 0});
    }
    ++rows.back().count;
  }
  if (rows.size() < kFewestRows || rows.back().count < kFewestPoints) return std::nullopt;
  const bool down = rows[0].latitude > rows[1].latitude;
  for (std::size_t k = 1; k < rows.size(); ++k)
    if ((rows[k - 1].latitude > rows[k].latitude) != down) return std::nullopt;
  return rows;
}

/// The corners of one cell between two parallels and two meridians, anticlockwise.
void add_cell(double west, double east, double south, double north, std::size_t pieces, double* lon, double* lat) {
  for (std::size_t k = 0; k <= pieces; ++k) {
    const double along = double(k) / double(pieces);
    lon[k] = lon[2 * pieces + 1 - k] = k == pieces ? east : west + (east - west) * along;
    lat[k] = south;
    lat[2 * pieces + 1 - k] = north;
  }
}

std::size_t pieces_of(double width) { return std::size_t(std::max(1.0, std::ceil(width / kLongestSide_deg - 1e-9))); }

}  // namespace

std::optional<ReducedRows> reduced_rows(const std::vector<double>& lon_deg, const std::vector<double>& lat_deg,
                                        const std::string& place) {
  const auto missing = [](double value) { return std::isnan(value); };
  if (std::ranges::any_of(lon_deg, missing) || std::ranges::any_of(lat_deg, missing)) return std::nullopt;
  const auto rows = runs(lat_deg);
  if (!rows) return std::nullopt;
  ReducedRows result;
  AxisCells lat;
  std::vector<AxisCells> lon;
  try {
    Remarks unused;
    AxisValues latitudes{place, "latitude", {}, {}, "", false, "degrees"};
    for (const Row& row : *rows) latitudes.centres.push_back(row.latitude);
    lat = latitude_cells(latitudes, unused);
    result.gaussian = use_quadrature_edges(lat, unused);
    for (const Row& row : *rows) {
      const auto first = lon_deg.begin() + std::ptrdiff_t(row.first);
      const AxisValues longitudes{place, "longitude", {first, first + std::ptrdiff_t(row.count)}, {}, "",
                                  false, "degrees"};
      lon.push_back(longitude_cells(longitudes, unused));
      if (lon.back().index.size() != row.count) return std::nullopt;
    }
  } catch (const Error&) {
    return std::nullopt;  // these points are no rows of cells
  }
  double widest = 0;
  for (const AxisCells& cells : lon)
    for (std::size_t k = 0; k + 1 < cells.edges.size(); ++k)
      widest = std::max(widest, cells.edges[k + 1] - cells.edges[k]);
  result.rows = rows->size();
  mesh::CellCorners& corners = result.corners;
  corners.most = 2 * pieces_of(widest) + 2;
  corners.lon_deg.assign(lon_deg.size() * corners.most, std::numeric_limits<double>::quiet_NaN());
  corners.lat_deg = corners.lon_deg;
  corners.centre_lon_deg = lon_deg;
  corners.centre_lat_deg = lat_deg;
  corners.nx = lon_deg.size();
  for (std::size_t k = 0; k < lat.index.size(); ++k) {
    const Row& row = (*rows)[lat.index[k]];
    const AxisCells& cells = lon[lat.index[k]];
    for (std::size_t i = 0; i < row.count; ++i) {
      const std::size_t at = (row.first + cells.index[i]) * corners.most;
      add_cell(cells.edges[i], cells.edges[i + 1], lat.edges[k], lat.edges[k + 1],
               pieces_of(cells.edges[i + 1] - cells.edges[i]), corners.lon_deg.data() + at,
               corners.lat_deg.data() + at);
    }
  }
  return result;
}

}  // namespace windrow::cf
