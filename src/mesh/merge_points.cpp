// Which listed corners are the same place: a spatial hash of points, looked up within each point's own tolerance.
#include <algorithm>
#include <cmath>
#include <limits>

#include "listed_cells.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

constexpr double kPartOfSide = 0.01;
constexpr std::uint32_t kNone = std::numeric_limits<std::uint32_t>::max();

// How near another point must be to be the same one (rad): by the shortest side of any cell there that is a side at
// all.
std::vector<double> tolerances(const ListedCells& listed, double rounding) {
  std::vector<double> out(listed.point.size(), rounding);
  for (std::size_t k = 0; k < listed.cells(); ++k) {
    const std::span<const std::uint32_t> corners = listed.corners(k);
    double shortest = std::numeric_limits<double>::infinity();
    for (std::size_t c = 0; c < corners.size(); ++c) {
      const double side = norm(listed.point[corners[(c + 1) % corners.size()]] - listed.point[corners[c]]);
      if (side > rounding) shortest = std::min(shortest, side);
    }
    for (const std::uint32_t c : corners) out[c] = std::min(out[c], kPartOfSide * shortest);
  }
  return out;
}

class PointHash {
 public:
  PointHash(const std::vector<Vec3>& points, double reach) : points_(points), width_(kWidth * reach) {
    std::size_t slots = 16;
    while (slots < 2 * points.size()) slots *= 2;
    head_.assign(slots, kNone);
    next_.assign(points.size(), kNone);
  }

  void add(std::uint32_t number) {
    const Vec3& p = points_[number];
    std::uint32_t& head = head_[slot(box(p.x), box(p.y), box(p.z))];
    next_[number] = head;
    head = number;
  }

  // The nearest of the points added within `tolerance` (at most the reach) of p; of equally near ones the first.
  [[nodiscard]] std::uint32_t find(const Vec3& p, double tolerance) const {
    std::uint32_t found = kNone;
    double nearest = tolerance * tolerance;
    const std::int64_t x1 = box(p.x + tolerance), y1 = box(p.y + tolerance), z1 = box(p.z + tolerance);
    for (std::int64_t x = box(p.x - tolerance); x <= x1; ++x) {
      for (std::int64_t y = box(p.y - tolerance); y <= y1; ++y) {
        for (std::int64_t z = box(p.z - tolerance); z <= z1; ++z) {
          for (std::uint32_t k = head_[slot(x, y, z)]; k != kNone; k = next_[k]) {
            const Vec3 off = points_[k] - p;
            const double distance2 = dot(off, off);
            if (distance2 > nearest || (distance2 == nearest && k > found)) continue;
            nearest = distance2;
            found = k;
          }
        }
      }
    }
    return found;
  }

 private:
  static constexpr double kWidth = 16;  // of a box, in reaches: few searches touch more than one box
  [[nodiscard]] std::int64_t box(double v) const { return static_cast<std::int64_t>(std::floor(v / width_)); }
  [[nodiscard]] std::size_t slot(std::int64_t x, std::int64_t y, std::int64_t z) const {
    std::uint64_t h = static_cast<std::uint64_t>(x) * 0x9e3779b97f4a7c15ULL;
    h = (h ^ static_cast<std::uint64_t>(y)) * 0xbf58476d1ce4e5b9ULL;
    h = (h ^ (h >> 29) ^ static_cast<std::uint64_t>(z)) * 0x94d049bb133111ebULL;
    return (h ^ (h >> 31)) & (head_.size() - 1);
  }

  const std::vector<Vec3>& points_;
  double width_;
  std::vector<std::uint32_t> head_, next_;
};

}  // namespace

std::vector<std::uint32_t> merge_points(const ListedCells& listed) {
  const double rounding = Angle::degrees(listed.rounding_deg).radians();
  const std::vector<double> tolerance = tolerances(listed, rounding);
  PointHash hash(listed.point, rounding);
  std::vector<std::uint32_t> first(listed.point.size());
  for (std::uint32_t k = 0; k < first.size(); ++k) {
    const std::uint32_t found = hash.find(listed.point[k], tolerance[k]);
    first[k] = found == kNone ? k : found;
    if (found == kNone) hash.add(k);
  }
  return first;
}

}  // namespace windrow::mesh
