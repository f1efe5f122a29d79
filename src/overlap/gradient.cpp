// Gradients of cell means: least squares over the neighbours that have a value, limited at the cell's corners.
#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "windrow/base/error.h"
#include "windrow/overlap/methods.h"

namespace windrow::overlap {
namespace {

using linear_map::Quantity;
using sphere::Vec3;

struct Offset {
  double first, second;  // components of a position in a cell's tangent frame
};

// Everything that does not depend on values. Rows of `neighbour` and `corner` belong to cells.
struct Frames {
  Neighbours neighbours;
  std::vector<Offset> neighbour;  // centroids of the neighbours, one each
  std::vector<std::uint64_t> corner_start;
  std::vector<Offset> corner;
  std::vector<double> area;  // of totals
};

// Where an arc's tangents at its ends meet, or its middle pushed out as far: the arc lies within the triangle of this
// point and its ends, so a linear function is bounded on it by the three.
Vec3 meeting_of_tangents(const sphere::Arc& arc) {
  const Vec3 centre = arc.circle.d * arc.circle.n;
  const Vec3 middle = 0.5 * (arc.from + arc.to) - centre;
  const double r = arc.circle.radius;
  const double cos2 = dot(middle, middle) / (r * r);  // squared cosine of half the arc's angle, >= 0.5
  return centre + (1 / std::max(cos2, 0.25)) * middle;
}

Frames make_frames(const mesh::Mesh& source, bool limited, bool total) {
  Frames out;
  const Centroids centre = centroids(source);
  out.neighbours = neighbours(source);
  out.neighbour.reserve(out.neighbours.cell.size());
  sphere::Polygon polygon;
  out.corner_start.push_back(0);
  for (std::size_t k = 0; k < source.size(); ++k) {
    const auto offset = [&](const Vec3& p) {
      // The frame stands upright on the centroid's direction, so its part along the frame is zero.
      return Offset{dot(p - centre.direction[k], centre.first[k]), dot(p - centre.direction[k], centre.second[k])};
    };
    for (auto n = out.neighbours.start[k]; n < out.neighbours.start[k + 1]; ++n) {
      out.neighbour.push_back(offset(centre.direction[out.neighbours.cell[n]]));
    }
    if (limited) {
      source.cell_into(k, polygon);
      for (const sphere::Piece& piece : polygon.pieces) {
        for (const sphere::Arc& arc : piece.loops.front()) {
          out.corner.push_back(offset(arc.from));
          out.corner.push_back(offset(meeting_of_tangents(arc)));
        }
      }
    }
    out.corner_start.push_back(out.corner.size());
    if (total) out.area.push_back(source.area(k));
  }
  return out;
}

// Directions that spread less than this over a second axis (ratio of eigenvalues; about 6 degrees to either side) count
// as one line: the slope across it would be noise.
constexpr double kLine = 0.01;

// Least squares of differences at offsets, each equation divided by its distance: exact for linear fields, near
// neighbours count most. Where they stand in one line, the gradient of least norm.
class LeastSquares {
 public:
  void add(const Offset& at, double difference) {
    const double d2 = at.first * at.first + at.second * at.second;
    if (!(d2 > 0)) return;
    a_ += at.first * at.first / d2;
    b_ += at.first * at.second / d2;
    c_ += at.second * at.second / d2;
    p_ += at.first * difference / d2;
    q_ += at.second * difference / d2;
  }
  [[nodiscard]] Offset solve() const {
    const double half = 0.5 * (a_ - c_);
    const double larger = 0.5 * (a_ + c_) + std::sqrt(half * half + b_ * b_);
    if (!(larger > 0)) return {0, 0};
    const double determinant = a_ * c_ - b_ * b_;
    if (determinant > kLine * larger * larger) {
      return {(c_ * p_ - b_ * q_) / determinant, (a_ * q_ - b_ * p_) / determinant};
    }
    // Along the eigenvector of the larger eigenvalue only.
    const Offset e = half > 0 ? Offset{larger - c_, b_} : Offset{b_, larger - a_};
    const double e2 = e.first * e.first + e.second * e.second;
    if (!(e2 > 0)) return {p_ / larger, 0};
    const double slope = (e.first * p_ + e.second * q_) / (e2 * larger);
    return {slope * e.first, slope * e.second};
  }

 private:
  double a_ = 0, b_ = 0, c_ = 0, p_ = 0, q_ = 0;
};

constexpr std::uint32_t kNone = 0xffffffffU;

// One cell whose gradient is asked for: where its values lie among the needed ones, where results go.
struct Task {
  std::uint32_t cell, own;
  std::uint32_t first_out = kNone, second_out = kNone;
  std::size_t begin = 0;  // of its neighbours' places
};

class GradientExtender final : public linear_map::Extender {
 public:
  GradientExtender(std::shared_ptr<const Frames> frames, bool limited, std::size_t cells,
                   const std::vector<std::uint32_t>& columns)
      : shared_(std::move(frames)), frames_(*shared_), limited_(limited) {
    const Neighbours& near = frames_.neighbours;
    std::vector<std::uint32_t> place(cells, kNone), task(cells, kNone);
    for (const std::uint32_t column : columns) {
      const auto cell = static_cast<std::uint32_t>(column % cells);
      place[cell] = 0;
      if (column < cells) continue;
      for (auto n = near.start[cell]; n < near.start[cell + 1]; ++n) place[near.cell[n]] = 0;
    }
    for (std::uint32_t k = 0; k < cells; ++k) {
      if (place[k] == kNone) continue;
      place[k] = static_cast<std::uint32_t>(needs_.size());
      needs_.push_back(k);
    }
    for (std::uint32_t out = 0; out < columns.size(); ++out) {
      const auto cell = static_cast<std::uint32_t>(columns[out] % cells);
      const std::size_t kind = columns[out] / cells;
      if (kind == 0) {
        values_.push_back({place[cell], out});
        continue;
      }
      if (task[cell] == kNone) {
        task[cell] = static_cast<std::uint32_t>(tasks_.size());
        tasks_.push_back({cell, place[cell], kNone, kNone, places_.size()});
        for (auto n = near.start[cell]; n < near.start[cell + 1]; ++n) places_.push_back(place[near.cell[n]]);
      }
      Task& t = tasks_[task[cell]];
      (kind == 1 ? t.first_out : t.second_out) = out;
    }
    density_.resize(needs_.size());
  }

  const std::vector<std::uint32_t>& needs() const override { return needs_; }

  void extend(std::span<const double> values, std::span<double> out) override {
    for (std::size_t k = 0; k < needs_.size(); ++k) {
      density_[k] = frames_.area.empty() ? values[k] : values[k] / frames_.area[needs_[k]];
    }
    for (const auto& [own, to] : values_) out[to] = values[own];
    for (const Task& task : tasks_) {
      Offset g = gradient(task);
      if (!frames_.area.empty()) g = {g.first * frames_.area[task.cell], g.second * frames_.area[task.cell]};
      if (task.first_out != kNone) out[task.first_out] = g.first;
      if (task.second_out != kNone) out[task.second_out] = g.second;
    }
  }

 private:
  Offset gradient(const Task& task) const {
    const double own = density_[task.own];
    if (!(own == own)) return {0, 0};
    LeastSquares fit;
    double lowest = own, highest = own;
    const auto first = frames_.neighbours.start[task.cell], last = frames_.neighbours.start[task.cell + 1];
    for (auto n = first; n < last; ++n) {
      const double there = density_[places_[task.begin + (n - first)]];
      if (!(there == there)) continue;
      fit.add(frames_.neighbour[n], there - own);
      lowest = std::min(lowest, there);
      highest = std::max(highest, there);
    }
    const Offset g = fit.solve();
    const double part = limited_ ? limit(task.cell, g, lowest - own, highest - own) : 1;
    return {part * g.first, part * g.second};
  }

  // Barth & Jespersen 1989, eqs for phi: the largest part of the gradient that keeps all corners within the means.
  double limit(std::uint32_t cell, const Offset& g, double down, double up) const {
    double part = 1;
    for (auto k = frames_.corner_start[cell]; k < frames_.corner_start[cell + 1]; ++k) {
      const Offset& corner = frames_.corner[k];
      const double change = g.first * corner.first + g.second * corner.second;
      if (change > up) part = std::min(part, up / change);
      if (change < down) part = std::min(part, down / change);
    }
    return part;
  }

  std::shared_ptr<const Frames> shared_;
  const Frames& frames_;
  bool limited_;
  std::vector<std::uint32_t> needs_;
  std::vector<std::array<std::uint32_t, 2>> values_;  // place among the needed, place in `out`
  std::vector<Task> tasks_;
  std::vector<std::uint32_t> places_;
  std::vector<double> density_;
};

class Gradient final : public linear_map::Extension {
 public:
  Gradient(Frames frames, std::size_t cells, bool limited)
      : frames_(std::make_shared<const Frames>(std::move(frames))), cells_(cells), limited_(limited) {}
  std::size_t cells() const override { return cells_; }
  std::size_t columns() const override { return 3 * cells_; }
  std::unique_ptr<linear_map::Extender> extender(const std::vector<std::uint32_t>& columns) const override {
    return std::make_unique<GradientExtender>(frames_, limited_, cells_, columns);
  }

 private:
  std::shared_ptr<const Frames> frames_;
  std::size_t cells_;
  bool limited_;
};

}  // namespace

std::unique_ptr<linear_map::Extension> make_gradient(const mesh::Mesh& source, Quantity quantity, bool limited) {
  return std::make_unique<Gradient>(make_frames(source, limited, quantity == Quantity::total), source.size(), limited);
}

}  // namespace windrow::overlap
