// Reading corners and sorting out cells. CF 1.13 section 7.1: bounds of n-dimensional coordinates carry a trailing
// dimension of vertices, missing ones (since 1.12) at its end.
#include "cell_list.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numeric>

namespace windrow::cf {

namespace {

using Point = std::array<double, 3>;

/// Places this near (degrees) are one, when the file's own rounding is finer: a tenth of a metre.
constexpr double kSamePlace_deg = 1e-6;
/// Of so many cells in a row along the sorting direction, only a damaged file has more in one place.
constexpr std::size_t kMostNeighbours = 512;
constexpr double kRadians = M_PI / 180;

Point direction(double lon_deg, double lat_deg) {
  const double phi = lat_deg * kRadians, lambda = lon_deg * kRadians;
  return {std::cos(phi) * std::cos(lambda), std::cos(phi) * std::sin(lambda), std::sin(phi)};
}

double distance(const Point& a, const Point& b) { return std::hypot(a[0] - b[0], a[1] - b[1], a[2] - b[2]); }

/// Cells as points in space, for comparing them whatever the turn of their longitudes.
class Cells {
 public:
  Cells(const mesh::CellCorners& corners, bool inferred)
      : corners_(corners), inferred_(inferred), near_(std::max(2 * corners.rounding_deg, kSamePlace_deg) * kRadians) {}

  [[nodiscard]] std::vector<Point> corners_of(std::size_t cell) const {
    std::vector<Point> list;
    for (std::size_t k = cell * corners_.most; k < (cell + 1) * corners_.most; ++k)
      if (!std::isnan(corners_.lat_deg[k])) list.push_back(direction(corners_.lon_deg[k], corners_.lat_deg[k]));
    return list;
  }

  /// Fewer than three corners in different places.
  [[nodiscard]] bool flat(std::size_t cell) const {
    const std::vector<Point> list = corners_of(cell);
    std::size_t distinct = 0;
    for (std::size_t i = 0; i < list.size() && distinct < 3; ++i)
      distinct += std::none_of(list.begin(), list.begin() + std::ptrdiff_t(i),
                               [&](const Point& earlier) { return distance(earlier, list[i]) <= near_ / 8; });
    return distinct < 3;
  }

  [[nodiscard]] Point centre(std::size_t cell) const {
    return direction(corners_.centre_lon_deg[cell], corners_.centre_lat_deg[cell]);
  }

  [[nodiscard]] bool same(std::size_t a, std::size_t b) const {
    if (distance(centre(a), centre(b)) > near_) return false;
    if (inferred_) return true;
    const std::vector<Point> of_a = corners_of(a), of_b = corners_of(b);
    const auto held = [&](const std::vector<Point>& list, const Point& point) {
      return std::ranges::any_of(list, [&](const Point& other) { return distance(other, point) <= 2 * near_; });
    };
    return std::ranges::all_of(of_a, [&](const Point& p) { return held(of_b, p); }) &&
           std::ranges::all_of(of_b, [&](const Point& p) { return held(of_a, p); });
  }

  /// Marks in `keep` what repeats an earlier kept cell; returns how many. Sorted along a direction in which no grid has
  /// rows of equal places, so that only a few neighbours are compared.
  std::size_t drop_repeated(std::vector<bool>& keep) const {
    std::vector<std::pair<double, std::size_t>> along;
    for (std::size_t cell = 0; cell < keep.size(); ++cell) {
      if (!keep[cell]) continue;
      const Point p = centre(cell);
      along.emplace_back(0.5377 * p[0] + 0.2719 * p[1] + 0.7981 * p[2], cell);
    }
    std::ranges::sort(along);
    std::size_t dropped = 0;
    for (std::size_t i = 0; i < along.size(); ++i) {
      const std::size_t end = std::min(along.size(), i + kMostNeighbours);
      for (std::size_t j = i + 1; keep[along[i].second] && j < end && along[j].first - along[i].first <= near_; ++j) {
        const std::size_t a = along[i].second, b = along[j].second;
        if (!keep[b] || !same(a, b)) continue;
        keep[std::max(a, b)] = false;
        ++dropped;
      }
    }
    return dropped;
  }

 private:
  const mesh::CellCorners& corners_;
  bool inferred_;
  double near_;
};

/// The dimension of vertices: the only one of the bounds that the cells do not have.
std::optional<int> vertex_dim(const Header& header, const nc::Var& bounds, const std::vector<int>& dims) {
  std::optional<int> found;
  std::size_t shared = 0;
  for (const int id : bounds.dims) {
    if (std::ranges::find(dims, id) != dims.end()) {
      ++shared;
    } else if (header.dim(id).length != 1) {
      if (found) return std::nullopt;
      found = id;
    }
  }
  // Two are enough for cells along one dimension: the ends of a rectangle.
  const std::size_t fewest = dims.size() == 1 ? 2 : 3;
  if (shared != dims.size() || !found || header.dim(*found).length < fewest) return std::nullopt;
  return found;
}

/// Both ends in latitude and in longitude become the four corners between them.
void ends_to_corners(mesh::CellCorners& corners) {
  std::vector<double> lon, lat;
  for (std::size_t cell = 0; cell < corners.lat_deg.size() / 2; ++cell) {
    const auto [x0, x1] = std::pair(corners.lon_deg[2 * cell], corners.lon_deg[2 * cell + 1]);
    const auto [y0, y1] = std::pair(corners.lat_deg[2 * cell], corners.lat_deg[2 * cell + 1]);
    lon.insert(lon.end(), {x0, x1, x1, x0});
    lat.insert(lat.end(), {y0, y0, y1, y1});
  }
  corners.most = 4;
  corners.lon_deg = std::move(lon);
  corners.lat_deg = std::move(lat);
}

std::vector<double> take(const std::vector<double>& values, const std::vector<std::size_t>& cells, std::size_t width) {
  std::vector<double> kept;
  kept.reserve(cells.size() * width);
  for (const std::size_t cell : cells)
    kept.insert(kept.end(), values.begin() + std::ptrdiff_t(cell * width),
                values.begin() + std::ptrdiff_t((cell + 1) * width));
  return kept;
}

/// Rows and columns when the kept cells are all where they cross; otherwise a list.
Places places_of(const std::vector<bool>& keep, const std::vector<std::size_t>& cells, std::size_t ny, std::size_t nx) {
  std::vector<bool> row(ny, false), column(nx, false);
  for (const std::size_t cell : cells) row[cell / nx] = column[cell % nx] = true;
  Places places;
  places.width = nx;
  for (std::size_t j = 0; j < ny; ++j)
    if (row[j]) places.rows.push_back(j);
  for (std::size_t i = 0; i < nx; ++i)
    if (column[i]) places.columns.push_back(i);
  if (places.rows.size() * places.columns.size() == cells.size()) return places;
  places.rows.clear();
  places.columns.clear();
  for (std::size_t cell = 0; cell < keep.size(); ++cell)
    if (keep[cell]) places.listed.push_back(std::uint32_t(cell));
  return places;
}

}  // namespace

double rounding_of(const std::vector<double>& degrees, nc_type type) {
  const bool single = type == NC_FLOAT || std::ranges::all_of(degrees, [](double value) {
                        return std::isnan(value) || double(float(value)) == value;
                      });
  return single ? 1e-4 : 1e-9;
}

std::vector<double> read_degrees(const Context& context, const nc::Var& coordinate, const std::vector<int>& dims) {
  std::vector<double> values = context.inputs.over(coordinate, dims);
  const bool latitude = role_of(coordinate) == Role::latitude;
  for (std::size_t i = 0; i < values.size(); ++i)
    if (std::abs(values[i]) > (latitude ? 90 + 1e-3 : 1080))
      throw Error(Failure::data, context.inputs.place(coordinate),
                  fmt::format("coordinate '{}': {:g} degrees at position {} is no {}", coordinate.name, values[i], i,
                              latitude ? "latitude" : "longitude"));
  if (latitude)
    for (double& value : values) value = std::isnan(value) ? value : std::clamp(value, -90.0, 90.0);
  return values;
}

std::optional<mesh::CellCorners> read_corners(const Context& context, const LatLonPair& pair,
                                              const std::vector<int>& dims) {
  const Header& header = context.header();
  const std::string names[2] = {pair.longitude->text("bounds"), pair.latitude->text("bounds")};
  if (names[0].empty() && names[1].empty()) return std::nullopt;
  const nc::Var* bounds[2] = {header.find(names[0]), header.find(names[1])};
  std::optional<int> vertices[2];
  for (const int i : {0, 1}) {
    if (bounds[i] != nullptr && is_number(*bounds[i])) vertices[i] = vertex_dim(header, *bounds[i], dims);
    if (vertices[i]) continue;
    context.remarks.push_back(
        bounds[i] == nullptr
            ? fmt::format("bounds '{}' of '{}' are not in the file", names[i],
                          (i == 0 ? pair.longitude : pair.latitude)->name)
            : fmt::format(
                  "bounds '{}' have the shape {}, which is not that of '{}' and its vertices; they are not used",
                  names[i], header.shape_text(*bounds[i]), (i == 0 ? pair.longitude : pair.latitude)->name));
    return std::nullopt;
  }
  mesh::CellCorners corners;
  corners.most = header.dim(*vertices[1]).length;
  if (header.dim(*vertices[0]).length != corners.most)
    throw Error(Failure::data, header.path,
                fmt::format("bounds '{}' and '{}' have different numbers of vertices", names[0], names[1]));
  std::vector<int> all = dims;
  all.push_back(*vertices[0]);
  corners.lon_deg = context.inputs.over(*bounds[0], all, pair.longitude);
  all.back() = *vertices[1];
  corners.lat_deg = context.inputs.over(*bounds[1], all, pair.latitude);
  if (corners.most == 2) ends_to_corners(corners);
  for (std::size_t k = 0; k < corners.lat_deg.size(); ++k) {
    double& lat = corners.lat_deg[k];
    const bool missing = std::isnan(lat), after_gap = k % corners.most > 0 && std::isnan(corners.lat_deg[k - 1]);
    if (missing != std::isnan(corners.lon_deg[k]) || (!missing && after_gap))
      throw Error(Failure::data, header.path,
                  fmt::format("cell {} (counted from 0) of bounds '{}' and '{}' has a missing corner where {}",
                              k / corners.most, names[0], names[1],
                              missing != std::isnan(corners.lon_deg[k]) ? "the other has one" : "others follow"));
    if (missing) continue;
    if (std::abs(lat) > 90 + 1e-3 || std::abs(corners.lon_deg[k]) > 1080)
      throw Error(
          Failure::data, header.path,
          fmt::format("a corner of cell {} (counted from 0) at longitude {:g}, latitude {:g} is no place on the "
                      "globe",
                      k / corners.most, corners.lon_deg[k], lat));
    lat = std::clamp(lat, -90.0, 90.0);
  }
  corners.rounding_deg = rounding_of(corners.lat_deg, bounds[1]->type);
  return corners;
}

Places keep_usable(const Context& context, mesh::CellCorners& corners, std::size_t ny, std::size_t nx, bool inferred) {
  const std::size_t count = ny * nx;
  std::vector<bool> keep(count, true);
  std::size_t missing = 0, flat = 0;
  const Cells cells(corners, inferred);
  for (std::size_t cell = 0; cell < count; ++cell) {
    const bool there = !std::isnan(corners.centre_lat_deg[cell]) && !std::isnan(corners.centre_lon_deg[cell]) &&
                       !std::isnan(corners.lat_deg[cell * corners.most]);
    keep[cell] = there && !cells.flat(cell);
    missing += !there;
    flat += there && !keep[cell];
  }
  const std::size_t repeated = cells.drop_repeated(keep);
  const auto say = [&](std::size_t number, const char* what) {
    if (number > 0)
      context.remarks.push_back(
          fmt::format("{} cell{} {} {} left out", number, number > 1 ? "s" : "", what, number > 1 ? "are" : "is"));
  };
  say(missing, "without coordinates");
  say(flat, "without area (fewer than three different corners)");
  say(repeated, inferred ? "repeating an earlier one's centre" : "repeating an earlier one's centre and corners");

  std::vector<std::size_t> kept;
  for (std::size_t cell = 0; cell < count; ++cell)
    if (keep[cell]) kept.push_back(cell);
  if (kept.empty()) context.fail("none of its cells has coordinates and an area");
  Places places = places_of(keep, kept, ny, nx);
  corners.ny = places.listed.empty() ? places.rows.size() : 1;
  corners.nx = kept.size() / corners.ny;
  if (kept.size() == count) return places;
  corners.lon_deg = take(corners.lon_deg, kept, corners.most);
  corners.lat_deg = take(corners.lat_deg, kept, corners.most);
  corners.centre_lon_deg = take(corners.centre_lon_deg, kept, 1);
  corners.centre_lat_deg = take(corners.centre_lat_deg, kept, 1);
  return places;
}

mesh::Sides sides_of(const Context& context, bool parallels) {
  const std::string& word = context.hints.sides;
  if (word == "parallels") return mesh::Sides::parallels;
  if (word == "great-circles") return mesh::Sides::great_circles;
  if (!word.empty())
    throw Error(Failure::job, "grid.sides", fmt::format("'{}' is neither 'great-circles' nor 'parallels'", word));
  return parallels ? mesh::Sides::parallels : mesh::Sides::great_circles;
}

std::string sides_text(const Context& context, mesh::Sides sides) {
  return fmt::format(
      "sides along {}{}",
      sides == mesh::Sides::parallels ? "parallels where both ends are at one latitude" : "great circles",
      context.hints.sides.empty() ? "" : " (the job says so)");
}

}  // namespace windrow::cf
