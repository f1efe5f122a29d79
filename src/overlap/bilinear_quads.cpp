// Bilinear weights in the quadrilaterals of centres of structured grids that have no coordinates of their own.
#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "plane.h"
#include "sampling.h"
#include "windrow/overlap/methods.h"

namespace windrow::overlap {
namespace {

// How far outside (in units of its sides) a quadrilateral still counts as holding the place: more than rounding, far
// less than what shows in a result.
constexpr double kOnSide = 1e-9;

// Place of the origin in a quadrilateral a, b (along s), c, d (a's and b's partners along t).
struct InQuad {
  double s = 0.5, t = 0.5;
  double outside = 4;  // by how much s or t leaves 0..1
};

InQuad invert(const std::array<PlanePoint, 4>& q) {
  const PlanePoint ab{q[1].x - q[0].x, q[1].y - q[0].y}, ac{q[2].x - q[0].x, q[2].y - q[0].y};
  const PlanePoint twist{q[3].x - q[1].x - ac.x, q[3].y - q[1].y - ac.y};
  InQuad at;
  for (int k = 0; k < 30; ++k) {
    const double fx = q[0].x + at.s * ab.x + at.t * ac.x + at.s * at.t * twist.x;
    const double fy = q[0].y + at.s * ab.y + at.t * ac.y + at.s * at.t * twist.y;
    const PlanePoint ds{ab.x + at.t * twist.x, ab.y + at.t * twist.y}, dt{ac.x + at.s * twist.x, ac.y + at.s * twist.y};
    const double determinant = ds.x * dt.y - ds.y * dt.x;
    if (determinant == 0) return {};
    const double step_s = (fx * dt.y - fy * dt.x) / determinant, step_t = (fy * ds.x - fx * ds.y) / determinant;
    at.s = std::clamp(at.s - step_s, -2.0, 3.0);
    at.t = std::clamp(at.t - step_t, -2.0, 3.0);
    if (std::abs(step_s) + std::abs(step_t) < 1e-14) break;
  }
  at.outside = std::max({-at.s, at.s - 1, -at.t, at.t - 1});
  return at;
}

class Quadrilaterals final : public Sampler {
 public:
  explicit Quadrilaterals(const mesh::Mesh& source)
      : ny_(source.shape().first),
        nx_(source.shape().second),
        centre_(sphere_centres(source)),
        rest_(triangles(source)) {
    // Whether the last column touches the first is seen at the middle row.
    const Neighbours near = neighbours(source);
    const std::size_t middle = ny_ / 2 * nx_;
    const auto neighbour = [&](std::uint64_t n) { return near.cell.begin() + static_cast<std::ptrdiff_t>(n); };
    closed_ = nx_ > 2 && std::binary_search(neighbour(near.start[middle]), neighbour(near.start[middle + 1]),
                                            static_cast<std::uint32_t>(middle + nx_ - 1));
    goes_on_.resize(source.size(), false);
    for (std::size_t k = 0; k < source.size(); ++k) {
      for (auto n = near.start[k]; n < near.start[k + 1]; ++n) {
        if (!next_to(k, near.cell[n])) goes_on_[k] = true;
      }
    }
  }

  void weigh(const Place& place, std::size_t containing, std::vector<Weight>& out) const override {
    const Plane plane(place.direction);
    const auto j = static_cast<std::ptrdiff_t>(containing / nx_), i = static_cast<std::ptrdiff_t>(containing % nx_);
    InQuad best;
    std::array<std::size_t, 4> cells{};
    // The four about the cell's centre, and only if none of them holds the place those around them.
    for (const std::ptrdiff_t ring : {0, 1}) {
      for (std::ptrdiff_t dj = -1 - ring; dj <= ring; ++dj) {
        for (std::ptrdiff_t di = -1 - ring; di <= ring; ++di) try_quad(plane, j + dj, i + di, best, cells);
      }
      if (best.outside <= kOnSide) break;
    }
    if (best.outside > kOnSide) {
      return goes_on_[containing] ? rest_->weigh(place, containing, out) : nearest_side(plane, containing, out);
    }
    const double s = std::clamp(best.s, 0.0, 1.0), t = std::clamp(best.t, 0.0, 1.0);
    const std::array<double, 4> part{(1 - s) * (1 - t), s * (1 - t), (1 - s) * t, s * t};
    for (std::size_t k = 0; k < 4; ++k) out.push_back({static_cast<std::uint32_t>(cells[k]), part[k]});
  }

 private:
  [[nodiscard]] bool next_to(std::size_t a, std::size_t b) const {
    const std::size_t ja = a / nx_, ia = a % nx_, jb = b / nx_, ib = b % nx_;
    const std::size_t dj = ja > jb ? ja - jb : jb - ja, di = ia > ib ? ia - ib : ib - ia;
    return dj <= 1 && (di <= 1 || (closed_ && di == nx_ - 1));
  }

  // The nearest point of the lines between neighbouring centres around a cell: on the rim of the centres.
  void nearest_side(const Plane& plane, std::size_t containing, std::vector<Weight>& out) const {
    const std::size_t j = containing / nx_, i = containing % nx_;
    std::vector<std::size_t> cells;
    for (std::size_t row = j > 0 ? j - 1 : 0; row <= std::min(ny_ - 1, j + 1); ++row) {
      for (std::size_t k = 0; k < 3; ++k) {
        const std::size_t column = i + k;  // one more than the column meant
        if (closed_ || (column >= 1 && column <= nx_)) cells.push_back(row * nx_ + (column + nx_ - 1) % nx_);
      }
    }
    double least = std::numeric_limits<double>::infinity();
    Weight from{static_cast<std::uint32_t>(containing), 1}, to{static_cast<std::uint32_t>(containing), 0};
    for (const std::size_t a : cells) {
      for (const std::size_t b : cells) {
        const bool side = b > a && (a / nx_ == b / nx_ || a % nx_ == b % nx_) && next_to(a, b);
        if (!side || !plane.near_side(centre_[a]) || !plane.near_side(centre_[b])) continue;
        const Foot foot = foot_of_origin(plane(centre_[a]), plane(centre_[b]));
        if (foot.distance2 >= least) continue;
        least = foot.distance2;
        from = {static_cast<std::uint32_t>(a), 1 - foot.along};
        to = {static_cast<std::uint32_t>(b), foot.along};
      }
    }
    out.push_back(from);
    out.push_back(to);
  }

  // The quadrilateral whose first corner is the centre of row j, column i; keeps it when it fits better.
  void try_quad(const Plane& plane, std::ptrdiff_t j, std::ptrdiff_t i, InQuad& best,
                std::array<std::size_t, 4>& cells) const {
    const auto nx = static_cast<std::ptrdiff_t>(nx_);
    if (j < 0 || j + 1 >= static_cast<std::ptrdiff_t>(ny_)) return;
    if (!closed_ && (i < 0 || i + 1 >= nx)) return;
    const auto west = static_cast<std::size_t>((i + nx) % nx), east = static_cast<std::size_t>((i + 1 + nx) % nx);
    const std::size_t row = static_cast<std::size_t>(j) * nx_;
    const std::array<std::size_t, 4> own{row + west, row + east, row + nx_ + west, row + nx_ + east};
    std::array<PlanePoint, 4> q;
    for (std::size_t k = 0; k < 4; ++k) {
      if (!plane.near_side(centre_[own[k]])) return;
      q[k] = plane(centre_[own[k]]);
    }
    const InQuad at = invert(q);
    if (at.outside < best.outside) {
      best = at;
      cells = own;
    }
  }

  std::size_t ny_, nx_;
  std::vector<sphere::Vec3> centre_;
  std::unique_ptr<Sampler> rest_;
  bool closed_ = false;
  std::vector<bool> goes_on_;  // touches cells that rows and columns do not tell: folds, poles
};

}  // namespace

std::unique_ptr<Sampler> quadrilaterals(const mesh::Mesh& source) { return std::make_unique<Quadrilaterals>(source); }

}  // namespace windrow::overlap
