// Projecting corners and midpoints of a grid; which edges one circle surely follows, and the others split.
#include "projected_edges.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <exception>

#include "line_arcs.h"
#include "windrow/base/error.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

// The estimate that spares most edges the exact test is good to a factor of two or three: leave it ten.
constexpr double kEstimateTolerance = kLensTolerance / 10;
constexpr std::size_t kBatch = 1 << 15;  // points a projection call

// An edge in mesh coordinates and on the globe.
struct Edge {
  std::uint64_t number;
  double x0, y0, x1, y1;
  Vec3 from, to;
  double cell_area;  // of the smaller neighbour, roughly
};

class Builder {
 public:
  Builder(const std::vector<double>& x, const std::vector<double>& y, const Projector& projector, const Earth& earth,
          const std::string& place)
      : x_(x), y_(y), projector_(projector), earth_(earth), place_(place) {
    lines_.nx = x.size() - 1;
    lines_.ny = y.size() - 1;
  }

  ProjectedLines build() {
    place_corners();
    bend_edges();
    split_edges();
    return std::move(lines_);
  }

 private:
  [[nodiscard]] Edge edge(std::uint64_t number) const;
  [[nodiscard]] double rough_area(std::size_t j, std::size_t i) const;
  void to_sphere(std::vector<double>& x, std::vector<double>& y, std::vector<Vec3>& out) const;
  template <typename Fill>
  std::vector<Vec3> project_all(std::size_t count, Fill&& coordinate) const;
  void place_corners();
  void bend_edges();
  [[nodiscard]] bool surely_one_circle(std::uint64_t number) const;
  void split_edges();
  [[noreturn]] void refuse(double x, double y) const {
    throw Error(Failure::data, place_,
                fmt::format("the mesh reaches beyond its projection: x = {}, y = {} has no place on the globe", x, y));
  }

  const std::vector<double>& x_;
  const std::vector<double>& y_;
  const Projector& projector_;
  const Earth& earth_;
  const std::string& place_;
  ProjectedLines lines_;
  std::vector<float> off_middle_;  // how far along its edge a projected midpoint is from the middle (rad)
};

void Builder::to_sphere(std::vector<double>& x, std::vector<double>& y, std::vector<Vec3>& out) const {
  projector_(x, y);
  for (std::size_t k = 0; k < x.size(); ++k) {
    const bool placed = std::isfinite(x[k]) && std::isfinite(y[k]) && std::abs(y[k]) <= 90 + 1e-9;
    const double phi = std::clamp(y[k], -90.0, 90.0);
    out.push_back(placed ? sphere::point_degrees(x[k], authalic_latitude_deg(phi, earth_.e2))
                         : Vec3{std::numeric_limits<double>::quiet_NaN(), 0, 0});
  }
}

// Projects points 0..count-1, whose mesh coordinates `coordinate(k)` gives, in batches on all threads.
template <typename Fill>
std::vector<Vec3> Builder::project_all(std::size_t count, Fill&& coordinate) const {
  std::vector<Vec3> points(count);
  const std::size_t batches = (count + kBatch - 1) / kBatch;
  std::exception_ptr failure;
#pragma omp parallel for schedule(dynamic)
  for (std::size_t b = 0; b < batches; ++b) {
    try {
      const std::size_t first = b * kBatch;
      const std::size_t last = std::min(count, first + kBatch);
      std::vector<double> x, y;
      std::vector<Vec3> part;
      for (std::size_t k = first; k < last; ++k) {
        const auto [px, py] = coordinate(k);
        x.push_back(px);
        y.push_back(py);
      }
      to_sphere(x, y, part);
      std::copy(part.begin(), part.end(), points.begin() + static_cast<std::ptrdiff_t>(first));
    } catch (...) {
#pragma omp critical(windrow_projection_failure)
      failure = std::current_exception();
    }
  }
  if (failure) std::rethrow_exception(failure);
  for (std::size_t k = 0; k < count; ++k) {
    if (std::isnan(points[k].x)) {
      const auto [px, py] = coordinate(k);
      refuse(px, py);
    }
  }
  return points;
}

void Builder::place_corners() {
  const std::size_t width = lines_.nx + 1;
  lines_.corner =
      project_all(width * (lines_.ny + 1), [&](std::size_t k) { return std::pair(x_[k % width], y_[k / width]); });
}

Edge Builder::edge(std::uint64_t number) const {
  const std::size_t nx = lines_.nx;
  const std::size_t along = (lines_.ny + 1) * nx;
  if (number < along) {
    const std::size_t j = number / nx, i = number % nx;
    const double area = std::min(rough_area(std::min(j, lines_.ny - 1), i), rough_area(j == 0 ? 0 : j - 1, i));
    return {number, x_[i], y_[j], x_[i + 1], y_[j], lines_.at(j, i), lines_.at(j, i + 1), area};
  }
  const std::size_t j = (number - along) / (nx + 1), i = (number - along) % (nx + 1);
  const double area = std::min(rough_area(j, std::min(i, nx - 1)), rough_area(j, i == 0 ? 0 : i - 1));
  return {number, x_[i], y_[j], x_[i], y_[j + 1], lines_.at(j, i), lines_.at(j + 1, i), area};
}

// Half the product of the diagonals' cross: enough to scale a tolerance by.
double Builder::rough_area(std::size_t j, std::size_t i) const {
  return 0.5 * norm(cross(lines_.at(j + 1, i + 1) - lines_.at(j, i), lines_.at(j + 1, i) - lines_.at(j, i + 1)));
}

void Builder::bend_edges() {
  const std::size_t count = lines_.edges();
  const std::vector<Vec3> middle = project_all(count, [&](std::size_t k) {
    const std::size_t nx = lines_.nx;
    const std::size_t along = (lines_.ny + 1) * nx;
    if (k < along) return std::pair(0.5 * (x_[k % nx] + x_[k % nx + 1]), y_[k / nx]);
    const std::size_t j = (k - along) / (nx + 1);
    return std::pair(x_[(k - along) % (nx + 1)], 0.5 * (y_[j] + y_[j + 1]));
  });
  lines_.tilt.resize(count);
  off_middle_.resize(count);
#pragma omp parallel for schedule(static)
  for (std::size_t k = 0; k < count; ++k) {
    const Edge e = edge(k);
    const Vec3 chord = e.to - e.from;
    const double length = norm(chord);
    if (length <= sphere::kOnCircle) continue;
    lines_.tilt[k] = sphere::tilt_through(e.from, middle[k], e.to);
    off_middle_[k] = static_cast<float>(dot(chord, (middle[k] - e.from) + (middle[k] - e.to)) / (2 * length));
  }
}

// How an edge's bend differs from its neighbours' on the same line bounds what one circle misses. With y the offset
// from the chord: a fourth-order term a s⁴ leaves an area of a h⁵ / 120 = h / 360 times the second difference of the
// middle offsets; a third-order term b s³ leaves b h³/6 times the shift of the middle along the edge, = 2/9 of the
// first difference times that shift (h: length of the edge).
bool Builder::surely_one_circle(std::uint64_t number) const {
  const std::size_t nx = lines_.nx;
  const std::size_t along = (lines_.ny + 1) * nx;
  const bool is_along = number < along;
  const std::size_t position = is_along ? number % nx : (number - along) / (nx + 1);
  const std::size_t count = is_along ? nx : lines_.ny;
  if (count < 3) return false;
  const std::size_t step = is_along ? 1 : nx + 1;
  const std::uint64_t middle = position == 0 ? number + step : position == count - 1 ? number - step : number;
  const double before = lines_.tilt[middle - step];
  const double here = lines_.tilt[middle];
  const double after = lines_.tilt[middle + step];
  const Edge e = edge(number);
  const double length = norm(e.to - e.from);
  if (length <= sphere::kOnCircle) return true;
  if (!(length < kLongestChord)) return false;
  const double per_tilt = length * length / 8;  // middle offset of a short edge
  const double first = per_tilt * std::max(std::abs(after - here), std::abs(here - before));
  const double second = per_tilt * std::abs(after - 2 * here + before);
  const double missed = length * second / 360 + 2.0 / 9 * first * std::abs(off_middle_[number]);
  return missed <= kEstimateTolerance * e.cell_area;  // false for NaN
}

void Builder::split_edges() {
  std::vector<std::uint8_t> sure(lines_.edges());
#pragma omp parallel for schedule(static)
  for (std::size_t k = 0; k < sure.size(); ++k) sure[k] = surely_one_circle(k) ? 1 : 0;
  off_middle_ = {};
  std::vector<OpenLine> open;
  for (std::size_t k = 0; k < sure.size(); ++k) {
    if (sure[k]) continue;
    const Edge e = edge(k);
    open.push_back({k, e.from, e.to, e.cell_area});
  }
  const auto place = [&](const std::vector<OpenLine>& lines, std::size_t inner) {
    return project_all(lines.size() * inner, [&](std::size_t k) {
      const Edge e = edge(lines[k / inner].number);
      const double f = static_cast<double>(k % inner + 1) / static_cast<double>(inner + 1);
      return std::pair(e.x0 + f * (e.x1 - e.x0), e.y0 + f * (e.y1 - e.y0));
    });
  };
  const auto take = [&](std::uint64_t number, std::vector<Vec3> inner) {
    if (inner.size() == 1) return;  // the tilt says it all
#pragma omp critical(windrow_split_edges)
    lines_.split.emplace(number, std::move(inner));
  };
  const std::vector<OpenLine> rough = split_lines(open, place, take);
  if (!rough.empty()) {
    const Edge e = edge(rough.front().number);
    throw Error(Failure::data, place_,
                fmt::format("the cell edge from x = {}, y = {} to x = {}, y = {} is no smooth line on the globe", e.x0,
                            e.y0, e.x1, e.y1));
  }
}

}  // namespace

ProjectedLines build_lines(const std::vector<double>& x_edges, const std::vector<double>& y_edges,
                           const Projector& to_geographic, const Earth& earth, const std::string& place) {
  return Builder(x_edges, y_edges, to_geographic, earth, place).build();
}

void ProjectedLines::arcs(std::uint64_t edge, const Vec3& from, const Vec3& to, sphere::Loop& out) const {
  if (!split.empty()) {
    const auto found = split.find(edge);
    if (found != split.end()) {
      append_arcs(from, found->second.data(), found->second.size(), to, out);
      return;
    }
  }
  if (norm(to - from) > sphere::kOnCircle) out.push_back(arc_through(from, to, tilt[edge]));
}

}  // namespace windrow::mesh
