// Linear weights in the Delaunay triangle of cell centres that holds a place, found among the cells around it.
#include <algorithm>
#include <array>
#include <cmath>

#include "plane.h"
#include "sampling.h"
#include "windrow/overlap/methods.h"

namespace windrow::overlap {
namespace {

using sphere::Vec3;

// Parts below zero by no more than this are rounding: the place is on a side.
constexpr double kOnSide = 1e-12;

// A number in 0..1 that belongs to k (the finaliser of Steele, Lea & Flood 2014, OOPSLA: SplitMix).
double scattered(std::uint64_t k) {
  k += 0x9e3779b97f4a7c15ULL;
  k = (k ^ (k >> 30)) * 0xbf58476d1ce4e5b9ULL;
  k = (k ^ (k >> 27)) * 0x94d049bb133111ebULL;
  return static_cast<double>((k ^ (k >> 31)) >> 11) * 0x1p-53;
}

struct Triangle {
  std::array<std::size_t, 3> corner{};
  std::array<double, 3> part{};  // place = sum part * centre
  bool holds = false;
};

// The Delaunay triangles of points on a sphere are the faces of their convex hull (Brown 1979, Inf. Process. Lett. 9,
// 223): the triangle over a place is the one its ray leaves the hull through, the optimum of the linear programme
//   least sum of part_k * height_k   with   sum part_k * centre_k = place,   part_k >= 0,   height_k = 1.
// Heights that differ a little from one cell to another decide which diagonal is taken where more than three centres
// lie on one circle, the same way from every side.
class Triangles final : public Sampler {
 public:
  explicit Triangles(const mesh::Mesh& source) : centre_(sphere_centres(source)), near_(neighbours(source)) {
    height_.reserve(source.size());
    for (std::size_t k = 0; k < source.size(); ++k) height_.push_back(1 - 1e-4 * source.area(k) * scattered(k));
  }

  void weigh(const Place& place, std::size_t containing, std::vector<Weight>& out) const override {
    std::vector<std::uint32_t> ring = around({static_cast<std::uint32_t>(containing)});
    Triangle triangle = start(place.direction, ring, containing);
    if (!triangle.holds) return nearest_of_hull(place.direction, ring, out);
    improve(place.direction, around(ring), triangle);
    for (std::size_t k = 0; k < 3; ++k) {
      const double part = std::max(0.0, triangle.part[k]) * dot(centre_[triangle.corner[k]], place.direction);
      out.push_back({static_cast<std::uint32_t>(triangle.corner[k]), part});
    }
  }

 private:
  // The cells and their neighbours, ascending.
  [[nodiscard]] std::vector<std::uint32_t> around(const std::vector<std::uint32_t>& cells) const {
    std::vector<std::uint32_t> out = cells;
    for (const std::uint32_t cell : cells) {
      out.insert(out.end(), near_.cell.begin() + static_cast<std::ptrdiff_t>(near_.start[cell]),
                 near_.cell.begin() + static_cast<std::ptrdiff_t>(near_.start[cell + 1]));
    }
    std::sort(out.begin(), out.end());
    out.erase(std::unique(out.begin(), out.end()), out.end());
    return out;
  }

  // Parts from volumes of differences, which keep their digits for small triangles.
  [[nodiscard]] Triangle over(const Vec3& place, std::size_t a, std::size_t b, std::size_t c) const {
    const Vec3 to_a = centre_[a] - place, to_b = centre_[b] - place, to_c = centre_[c] - place;
    const Vec3 ab = centre_[b] - centre_[a], ac = centre_[c] - centre_[a];
    const double volume = dot(centre_[a], cross(ab, ac));
    Triangle out{{a, b, c}, {}, false};
    if (std::abs(volume) < 1e-9 * norm(ab) * norm(ac)) return out;  // in one line
    out.part = {dot(place, cross(to_b, to_c)) / volume, dot(place, cross(to_c, to_a)) / volume,
                dot(place, cross(to_a, to_b)) / volume};
    out.holds = std::all_of(out.part.begin(), out.part.end(), [](double part) { return part >= -kOnSide; });
    return out;
  }

  // Any triangle that holds the place: with the containing cell's centre, or else among its neighbours'.
  [[nodiscard]] Triangle start(const Vec3& place, const std::vector<std::uint32_t>& ring,
                               std::size_t containing) const {
    for (std::size_t a = 0; a < ring.size(); ++a) {
      for (std::size_t b = a + 1; b < ring.size(); ++b) {
        if (ring[a] == containing || ring[b] == containing) continue;
        if (Triangle t = over(place, containing, ring[a], ring[b]); t.holds) return t;
      }
    }
    for (std::size_t a = 0; a < ring.size(); ++a) {
      for (std::size_t b = a + 1; b < ring.size(); ++b) {
        for (std::size_t c = b + 1; c < ring.size(); ++c) {
          if (Triangle t = over(place, ring[a], ring[b], ring[c]); t.holds) return t;
        }
      }
    }
    return {};
  }

  // Simplex steps: a centre above the triangle's plane takes the place of a corner until there is none.
  void improve(const Vec3& place, const std::vector<std::uint32_t>& cells, Triangle& triangle) const {
    constexpr int kMost = 100;
    for (int step = 0; step < kMost; ++step) {
      const auto& [a, b, c] = triangle.corner;
      const Vec3 &xa = centre_[a], &xb = centre_[b], &xc = centre_[c];
      const double volume = dot(xa, cross(xb - xa, xc - xa));
      // The plane's normal: normal . corner = height at all three corners; differences from the first keep digits.
      const Vec3 normal =
          (1 / volume) * (height_[a] * cross(xb - xa, xc - xa) + (height_[b] - height_[a]) * cross(xc, xa) +
                          (height_[c] - height_[a]) * cross(xa, xb));
      double highest = 4 * std::numeric_limits<double>::epsilon();
      std::size_t entering = centre_.size();
      for (const std::uint32_t k : cells) {
        if (k == a || k == b || k == c) continue;
        const double above = dot(normal, centre_[k] - xa) - (height_[k] - height_[a]);
        if (above > highest) {
          highest = above;
          entering = k;
        }
      }
      if (entering == centre_.size()) return;
      // One of three exchanges holds the place again; on a side two do, and either gives the same weights.
      Triangle next;
      for (std::size_t k = 0; k < 3 && !next.holds; ++k) {
        std::array<std::size_t, 3> corner = triangle.corner;
        corner[k] = entering;
        next = over(place, corner[0], corner[1], corner[2]);
      }
      if (!next.holds) return;
      triangle = next;
    }
  }

  // Among all lines between two of the cells' centres, the point nearest to the place.
  void nearest_of_hull(const Vec3& place, const std::vector<std::uint32_t>& cells, std::vector<Weight>& out) const {
    const Plane plane(place);
    double least = std::numeric_limits<double>::infinity();
    Weight from{cells.front(), 1}, to{cells.front(), 0};
    for (std::size_t a = 0; a < cells.size(); ++a) {
      if (!plane.near_side(centre_[cells[a]])) continue;
      const PlanePoint p = plane(centre_[cells[a]]);
      for (std::size_t b = a; b < cells.size(); ++b) {
        if (!plane.near_side(centre_[cells[b]])) continue;
        const PlanePoint q = plane(centre_[cells[b]]);
        const Foot foot = foot_of_origin(p, q);
        if (foot.distance2 < least) {
          least = foot.distance2;
          from = {cells[a], 1 - foot.along};
          to = {cells[b], foot.along};
        }
      }
    }
    out.push_back(from);
    out.push_back(to);
  }

  std::vector<Vec3> centre_;
  Neighbours near_;
  std::vector<double> height_;
};

}  // namespace

std::unique_ptr<Sampler> triangles(const mesh::Mesh& source) { return std::make_unique<Triangles>(source); }

}  // namespace windrow::overlap
