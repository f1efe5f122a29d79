// Curvilinear grids: two-dimensional latitudes and longitudes (CF 1.13 section 5.2), with or without corner bounds.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "cell_list.h"
#include "windrow/mesh/mesh.h"

namespace windrow::cf {

namespace {

/// Halo columns that may be repeated at the end of a row, and how many columns a row needs to be judged at all.
constexpr std::size_t kMostHalo = 8, kFewestColumns = 8;
/// A row closes on itself when its ends are at most this many of its spacings apart.
constexpr double kSeamSpacings = 1.7;
/// Share of the rows that must agree (rows at a fold or a pole may look different).
constexpr double kRowShare = 0.9;

/// Which of two dimensions is y: by `axis` or a coordinate's role, then by name, else the slower one of the variable.
std::vector<int> y_then_x(const Context& context, const std::vector<int>& dims) {
  const auto leaning = [&](int id) {  // -1: y, 1: x
    const nc::Dim& dim = context.header().dim(id);
    if (const nc::Var* own = context.header().find(dim.name); own != nullptr && own->dims.size() == 1) {
      const std::string axis = lower(own->text("axis"));
      const Role role = role_of(*own);
      if (axis == "x" || role == Role::x || role == Role::longitude || role == Role::grid_longitude) return 1;
      if (axis == "y" || role == Role::y || role == Role::latitude || role == Role::grid_latitude) return -1;
    }
    const std::string name = lower(dim.name);
    for (const char* word : {"x", "i", "ni", "nx", "nlon", "lon", "longitude", "rlon", "xc", "west_east", "xi_rho"})
      if (name == word) return 1;
    for (const char* word : {"y", "j", "nj", "ny", "nlat", "lat", "latitude", "rlat", "yc", "south_north", "eta_rho"})
      if (name == word) return -1;
    return 0;
  };
  const int first = leaning(dims[0]), second = leaning(dims[1]);
  return first > second ? std::vector<int>{dims[1], dims[0]} : dims;
}

/// Centres of a grid, row by row.
struct Centres {
  std::vector<double> lon, lat;
  std::size_t ny = 0, nx = 0;

  [[nodiscard]] bool missing(std::size_t j, std::size_t i) const {
    return std::isnan(lon[j * nx + i]) || std::isnan(lat[j * nx + i]);
  }
  /// Degrees of arc, by haversine.
  [[nodiscard]] double apart(std::size_t j, std::size_t a, std::size_t b) const {
    const double radian = M_PI / 180;
    const double phi_a = lat[j * nx + a] * radian, phi_b = lat[j * nx + b] * radian;
    const double up = std::sin((phi_b - phi_a) / 2), along = std::sin((lon[j * nx + b] - lon[j * nx + a]) * radian / 2);
    const double h = up * up + std::cos(phi_a) * std::cos(phi_b) * along * along;
    return 2 * std::asin(std::sqrt(std::min(h, 1.0))) / radian;
  }
  [[nodiscard]] bool same(std::size_t j, std::size_t a, std::size_t b, double rounding) const {
    if (missing(j, a) || missing(j, b)) return missing(j, a) == missing(j, b);
    return apart(j, a, b) <= std::max(2 * rounding, 1e-6);
  }
  /// Columns [first, first + count), counted round.
  [[nodiscard]] Centres columns(std::ptrdiff_t first, std::size_t count) const {
    Centres part;
    part.ny = ny;
    part.nx = count;
    for (std::size_t j = 0; j < ny; ++j)
      for (std::size_t i = 0; i < count; ++i) {
        const std::size_t at = j * nx + std::size_t(first + std::ptrdiff_t(i + nx)) % nx;
        part.lon.push_back(lon[at]);
        part.lat.push_back(lat[at]);
      }
    return part;
  }
};

/// Number of columns at the end of all rows that repeat those at the beginning.
std::size_t halo_columns(const Centres& c, double rounding) {
  for (std::size_t halo = 1; halo <= kMostHalo && 2 * halo < c.nx && c.nx >= kFewestColumns; ++halo) {
    std::size_t alike = 0, there = 0;
    bool repeats = true;
    for (std::size_t j = 0; repeats && j < c.ny; ++j)
      for (std::size_t i = 0; repeats && i < halo; ++i) {
        repeats = c.same(j, c.nx - halo + i, i, rounding);
        there += !c.missing(j, i);
        alike += !c.missing(j, i) && repeats;
      }
    if (repeats && there > 0 && alike == there) return halo;
  }
  return 0;
}

/// Do the rows go all the way round, so that the first column follows the last?
bool closes(const Centres& c) {
  std::size_t rows = 0, closed = 0;
  for (std::size_t j = 0; j < c.ny && c.nx >= kFewestColumns; ++j) {
    std::vector<double> spacings;
    for (std::size_t i = 1; i < c.nx; ++i)
      if (!c.missing(j, i - 1) && !c.missing(j, i)) spacings.push_back(c.apart(j, i - 1, i));
    if (c.missing(j, 0) || c.missing(j, c.nx - 1) || spacings.size() < kFewestColumns / 2) continue;
    const auto middle = spacings.begin() + std::ptrdiff_t(spacings.size() / 2);
    std::nth_element(spacings.begin(), middle, spacings.end());
    ++rows;
    closed += c.apart(j, c.nx - 1, 0) <= kSeamSpacings * *middle;
  }
  return rows > 0 && double(closed) >= kRowShare * double(rows);
}

/// Continues the rows and columns into places without coordinates, ring by ring, as the great circles through two cells
/// go on; cells beside them get their outer corners from these. The cells themselves are left out later.
Centres continued(const Centres& c, bool round) {
  using Point = std::array<double, 3>;
  const double radian = M_PI / 180;
  const auto ny = std::ptrdiff_t(c.ny), nx = std::ptrdiff_t(c.nx);
  std::vector<std::optional<Point>> place(c.ny * c.nx);
  std::vector<std::size_t> open;
  for (std::size_t k = 0; k < place.size(); ++k) {
    const double phi = c.lat[k] * radian, lambda = c.lon[k] * radian;
    if (c.missing(k / c.nx, k % c.nx))
      open.push_back(k);
    else
      place[k] = {std::cos(phi) * std::cos(lambda), std::cos(phi) * std::sin(lambda), std::sin(phi)};
  }
  if (open.empty() || open.size() == place.size()) return c;
  const auto at = [&](std::ptrdiff_t j, std::ptrdiff_t i) -> const Point* {
    if (round) i = (i + nx) % nx;
    const bool inside = j >= 0 && j < ny && i >= 0 && i < nx;
    return inside && place[j * nx + i] ? &*place[j * nx + i] : nullptr;
  };
  for (bool grown = true; grown && !open.empty();) {
    std::vector<std::pair<std::size_t, Point>> found;
    std::vector<std::size_t> rest;
    for (const std::size_t k : open) {
      Point sum{};
      for (const auto& [up, right] : {std::pair{0, 1}, {0, -1}, {1, 0}, {-1, 0}}) {
        const auto j = std::ptrdiff_t(k) / nx, i = std::ptrdiff_t(k) % nx;
        const Point *near = at(j + up, i + right), *far = at(j + 2 * up, i + 2 * right);
        if (near == nullptr || far == nullptr) continue;
        const double along = 2 * ((*near)[0] * (*far)[0] + (*near)[1] * (*far)[1] + (*near)[2] * (*far)[2]);
        for (std::size_t d = 0; d < 3; ++d) sum[d] += along * (*near)[d] - (*far)[d];
      }
      const double length = std::hypot(sum[0], sum[1], sum[2]);
      if (length > 0.5)
        found.emplace_back(k, Point{sum[0] / length, sum[1] / length, sum[2] / length});
      else
        rest.push_back(k);
    }
    for (const auto& [k, point] : found) place[k] = point;
    grown = !found.empty();
    open = std::move(rest);
  }
  Centres full = c;
  for (std::size_t k = 0; k < place.size(); ++k) {
    if (!place[k] || !c.missing(k / c.nx, k % c.nx)) continue;
    full.lon[k] = std::atan2((*place[k])[1], (*place[k])[0]) / radian;
    full.lat[k] = std::asin(std::clamp((*place[k])[2], -1.0, 1.0)) / radian;
  }
  return full;
}

mesh::CellCorners inferred(const Context& context, const Centres& c, bool round) {
  const std::string place = context.header().path;
  mesh::CellCorners all;
  try {
    const Centres full = continued(c, round), wide = round ? full.columns(-1, full.nx + 2) : full;
    all = mesh::infer_corners(wide.lon, wide.lat, wide.ny, wide.nx, place);
  } catch (const Error& error) {
    throw Error(error.kind(), "",
                fmt::format("{}; add bounds to the coordinates of '{}', or name a file that has them with grid = {{ "
                            "coordinates = \"...\" }} in the [[run]]",
                            error.what(), context.variable.name));
  }
  if (!round) return all;
  mesh::CellCorners corners;
  corners.most = all.most;
  for (std::size_t j = 0; j < c.ny; ++j) {
    const auto first = std::ptrdiff_t((j * (c.nx + 2) + 1) * all.most), last = first + std::ptrdiff_t(c.nx * all.most);
    corners.lon_deg.insert(corners.lon_deg.end(), all.lon_deg.begin() + first, all.lon_deg.begin() + last);
    corners.lat_deg.insert(corners.lat_deg.end(), all.lat_deg.begin() + first, all.lat_deg.begin() + last);
  }
  return corners;
}

}  // namespace

std::optional<FileGrid> find_curvilinear(const Context& context) {
  const auto pair = latlon_pair(context, 2);
  if (!pair) return std::nullopt;
  FileGrid result;
  result.dims = y_then_x(context, pair->dims);
  const std::size_t ny = context.header().dim(result.dims[0]).length, nx = context.header().dim(result.dims[1]).length;
  if (ny == 0 || nx == 0) context.fail("its latitudes and longitudes are empty");
  Centres centres{read_degrees(context, *pair->longitude, result.dims),
                  read_degrees(context, *pair->latitude, result.dims), ny, nx};
  const double rounding = rounding_of(centres.lat, pair->latitude->type);
  auto corners = read_corners(context, *pair, result.dims);
  const bool bounds = corners.has_value();
  if (!bounds && ny * nx == 1) return std::nullopt;  // a point
  std::size_t halo = 0;
  bool round = false;
  if (!bounds) {
    halo = halo_columns(centres, rounding);
    if (halo > 0) {
      context.remarks.push_back(fmt::format("the last {} column{} of '{}' repeat{} the first and {} left out", halo,
                                            halo > 1 ? "s" : "", pair->latitude->name, halo > 1 ? "" : "s",
                                            halo > 1 ? "are" : "is"));
      centres = centres.columns(0, nx - halo);
    }
    round = halo > 0 || closes(centres);
    corners = inferred(context, centres, round);
    corners->rounding_deg = rounding;
  }
  corners->centre_lon_deg = centres.lon;
  corners->centre_lat_deg = centres.lat;
  Grid& grid = result.grid;
  grid.kind = GridKind::cells;
  result.places = keep_usable(context, *corners, ny, nx - halo, !bounds);
  if (halo > 0) {
    for (std::uint32_t& at : result.places.listed)
      at = std::uint32_t(at / result.places.width * nx + at % result.places.width);
    result.places.width = nx;
  }
  grid.sides = sides_of(context, corners->most == 4);
  grid.corners = *std::move(corners);
  grid.mapping = mapping_records(context.mapping);
  const std::size_t count = result.places.size();
  const std::string shape =
      grid.corners.ny > 1 || ny == 1 ? fmt::format("{} x {}", grid.corners.ny, grid.corners.nx) : std::to_string(count);
  grid.how = fmt::format("curvilinear, {} cells{}, corners {}, {}", shape, round ? ", rows closed" : "",
                         bounds ? fmt::format("from the file's bounds '{}'", pair->latitude->text("bounds"))
                                : "inferred from the centres (no bounds in the file)",
                         sides_text(context, grid.sides));
  grid.why =
      fmt::format("two-dimensional coordinates {} and {}", evidence(*pair->latitude), evidence(*pair->longitude));
  return result;
}

}  // namespace windrow::cf
