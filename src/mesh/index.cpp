// Boxes of cells and the packed tree over them. Knows meshes only by their hulls and polygons.
#include "windrow/mesh/index.h"

#include <algorithm>
#include <limits>

namespace windrow::mesh {
namespace {

using sphere::Vec3;

// Rounding to float moves a coordinate of the sphere by at most 2^-25; this is more.
constexpr double kFloatRounding = 0x1p-24;

// A box in double precision, rounded outwards once at the end.
struct Extent {
  Vec3 low{2, 2, 2}, high{-2, -2, -2};

  void add(const Vec3& p, double margin) {
    low = {std::min(low.x, p.x - margin), std::min(low.y, p.y - margin), std::min(low.z, p.z - margin)};
    high = {std::max(high.x, p.x + margin), std::max(high.y, p.y + margin), std::max(high.z, p.z + margin)};
  }
  // A coordinate grows inside a region beyond what its boundary reaches only about the end of that axis, and a region
  // (under a hemisphere) that holds the end of an axis has boundary on both sides of the two planes through that axis.
  void add_axis_ends() {
    if (low.x > high.x) return;
    const bool x = low.x <= 0 && high.x >= 0, y = low.y <= 0 && high.y >= 0, z = low.z <= 0 && high.z >= 0;
    const Extent e = *this;
    if (y && z) widen(e.low.x, e.high.x, low.x, high.x);
    if (z && x) widen(e.low.y, e.high.y, low.y, high.y);
    if (x && y) widen(e.low.z, e.high.z, low.z, high.z);
  }
  [[nodiscard]] Box box() const {
    Box out;
    if (low.x > high.x) return out;
    const auto down = [](double v) { return static_cast<float>(v - kFloatRounding); };
    const auto up = [](double v) { return static_cast<float>(v + kFloatRounding); };
    out.low = {down(low.x), down(low.y), down(low.z)};
    out.high = {up(high.x), up(high.y), up(high.z)};
    return out;
  }

 private:
  static void widen(double boundary_low, double boundary_high, double& to_low, double& to_high) {
    if (boundary_high > 0) to_high = std::max(to_high, 1.0);
    if (boundary_low < 0) to_low = std::min(to_low, -1.0);
  }
};

// Box of one cell; `polygon` is memory to work in.
Box box_of_cell(const Mesh& mesh, std::size_t index, sphere::Polygon& polygon) {
  if (!mesh.has_area()) {
    const GeoPoint centre = mesh.centre(index);
    Extent point;
    point.add(sphere::point_degrees(centre.longitude.degrees(),
                                    authalic_latitude_deg(centre.latitude.degrees(), mesh.earth().e2)),
              0);
    return point.box();
  }
  if (const std::optional<Hull> hull = mesh.hull(index)) {
    Extent extent;
    for (const Vec3& corner : hull->corner) extent.add(corner, hull->margin);
    extent.add_axis_ends();
    return extent.box();
  }
  mesh.cell_into(index, polygon);
  return box_of(polygon);
}

// 21 bits spread so that two free ones follow each.
std::uint64_t spread(std::uint64_t v) {
  v = (v | v << 32) & 0x001f00000000ffffULL;
  v = (v | v << 16) & 0x001f0000ff0000ffULL;
  v = (v | v << 8) & 0x100f00f00f00f00fULL;
  v = (v | v << 4) & 0x10c30c30c30c30c3ULL;
  return (v | v << 2) & 0x1249249249249249ULL;
}

struct Place {
  std::uint64_t key;
  std::uint32_t cell;
  bool operator<(const Place& other) const { return key != other.key ? key < other.key : cell < other.cell; }
};

// Cells along a space-filling curve (the bits of three coordinates in turn), scaled to where the cells are.
std::vector<Place> curve_order(const std::vector<Box>& boxes) {
  std::array<float, 3> low{2, 2, 2}, high{-2, -2, -2};
  for (const Box& b : boxes) {
    for (std::size_t k = 0; k < 3; ++k) {
      low[k] = std::min(low[k], b.low[k]);
      high[k] = std::max(high[k], b.high[k]);
    }
  }
  constexpr double kSteps = (1 << 21) - 1;
  std::vector<Place> order(boxes.size());
#pragma omp parallel for schedule(static)
  for (std::size_t i = 0; i < boxes.size(); ++i) {
    std::uint64_t key = 0;
    for (std::size_t k = 0; k < 3; ++k) {
      const double middle = 0.5 * (static_cast<double>(boxes[i].low[k]) + static_cast<double>(boxes[i].high[k]));
      const double width = std::max(static_cast<double>(high[k]) - static_cast<double>(low[k]), 1e-30);
      const double part = std::clamp((middle - static_cast<double>(low[k])) / width, 0.0, 1.0);
      key |= spread(static_cast<std::uint64_t>(part * kSteps)) << k;
    }
    order[i] = {key, static_cast<std::uint32_t>(i)};
  }
  std::sort(order.begin(), order.end());
  return order;
}

}  // namespace

void Box::add(const Vec3& point, double margin) {
  Extent extent;
  extent.add(point, margin);
  const Box one = extent.box();
  for (std::size_t k = 0; k < 3; ++k) {
    low[k] = std::min(low[k], one.low[k]);
    high[k] = std::max(high[k], one.high[k]);
  }
}

Box box_of(const sphere::Polygon& polygon) {
  Extent extent;
  for (const sphere::Piece& piece : polygon.pieces) {
    for (const sphere::Loop& loop : piece.loops) {
      for (const sphere::Arc& arc : loop) {
        const double bulge = arc.circle.radius * arc.dtheta * arc.dtheta / 8;  // >= r (1 - cos(dtheta / 2))
        extent.add(arc.from, bulge);
        extent.add(arc.to, bulge);
      }
    }
  }
  extent.add_axis_ends();
  return extent.box();
}

Index::Index(const Mesh& mesh) {
  std::vector<Box> boxes(mesh.size());
#pragma omp parallel
  {
    sphere::Polygon polygon;
#pragma omp for schedule(static)
    for (std::size_t i = 0; i < boxes.size(); ++i) boxes[i] = box_of_cell(mesh, i, polygon);
  }
  const std::vector<Place> order = curve_order(boxes);
  cell_.reserve(order.size());
  level_.emplace_back();
  level_[0].reserve(order.size());
  for (const Place& place : order) {
    cell_.push_back(place.cell);
    level_[0].push_back(boxes[place.cell]);
  }
  while (level_.back().size() > kFan) {
    const std::vector<Box>& below = level_.back();
    std::vector<Box> above((below.size() + kFan - 1) / kFan);
    for (std::size_t i = 0; i < below.size(); ++i) {
      Box& b = above[i / kFan];
      for (std::size_t k = 0; k < 3; ++k) {
        b.low[k] = std::min(b.low[k], below[i].low[k]);
        b.high[k] = std::max(b.high[k], below[i].high[k]);
      }
    }
    level_.push_back(std::move(above));
  }
}

void Index::find(const Box& box, std::vector<std::uint32_t>& out) const {
  out.clear();
  struct Group {
    std::uint32_t level, first;
  };
  // Every level leaves at most kFan groups waiting; 2^32 cells make eleven levels.
  std::array<Group, 12 * kFan> waiting;
  std::size_t count = 0;
  waiting[count++] = {static_cast<std::uint32_t>(level_.size() - 1), 0};
  while (count > 0) {
    const Group group = waiting[--count];
    const std::vector<Box>& boxes = level_[group.level];
    const std::size_t last = std::min<std::size_t>(boxes.size(), group.first + kFan);
    for (std::size_t i = group.first; i < last; ++i) {
      if (!boxes[i].meets(box)) continue;
      if (group.level == 0) {
        out.push_back(cell_[i]);
      } else {
        waiting[count++] = {group.level - 1, static_cast<std::uint32_t>(i * kFan)};
      }
    }
  }
  std::sort(out.begin(), out.end());
}

}  // namespace windrow::mesh
