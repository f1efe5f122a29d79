// One search index for every mesh: boxes of cells in space, where the date line and the poles are nowhere special.
#pragma once
#include <array>
#include <cstdint>
#include <vector>

#include "windrow/mesh/mesh.h"

namespace windrow::mesh {

/// A box in space (chords of the unit sphere), rounded outwards.
struct Box {
  std::array<float, 3> low{2, 2, 2}, high{-2, -2, -2};
  void add(const sphere::Vec3& point, double margin);
  [[nodiscard]] bool meets(const Box& other) const {
    return low[0] <= other.high[0] && other.low[0] <= high[0] && low[1] <= other.high[1] && other.low[1] <= high[1] &&
           low[2] <= other.high[2] && other.low[2] <= high[2];
  }
};

/// Box of a region: its vertices, and as much more as its arcs bulge; a region of many degrees may hold the middle of
/// its box's side on the sphere, so margins follow from the extent.
Box box_of(const sphere::Polygon& polygon);

/// A packed tree of boxes, built once; about 30 bytes a cell. Immutable: any number of threads may search it.
class Index {
 public:
  explicit Index(const Mesh& mesh);
  /// Cells whose boxes meet `box`, ascending; `out` is cleared first.
  void find(const Box& box, std::vector<std::uint32_t>& out) const;

 private:
  // Leaves in the order of a space-filling curve, kFan boxes under one of the level above.
  static constexpr std::size_t kFan = 8;
  std::vector<std::uint32_t> cell_;
  std::vector<std::vector<Box>> level_;  // level_[0]: one a cell
};

}  // namespace windrow::mesh
