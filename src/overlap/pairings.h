// Overlap areas before they become shares: what the ways of finding them hand over.
#pragma once
#include <array>
#include <cstdint>
#include <limits>
#include <vector>

#include "windrow/overlap/methods.h"
#include "windrow/sphere/area.h"

namespace windrow::overlap {

/// Overlap of one cell with one cell of the other mesh, steradians.
struct Pairing {
  std::uint32_t column;
  double area;
};

/// First moment of an overlap along the two tangents at the source cell's centroid.
using Moment = std::array<double, 2>;

/// Overlaps of a run of cells, columns ascending within a row.
struct Rows {
  std::vector<std::uint32_t> count;  ///< pairings of each row
  std::vector<Pairing> pairings;
  std::vector<Moment> moments;        ///< one a pairing where asked for, otherwise empty
  std::vector<std::uint8_t> covered;  ///< row lies wholly within the other mesh's extent: its sum is checked
  std::vector<double> bound;          ///< closure bound of each row, relative
};

/// Takes moments about the source's centroids; the source is what is numbered by rows or by columns.
struct MomentFrame {
  const Centroids* source = nullptr;  ///< null: no moments
  bool source_is_row = false;
  [[nodiscard]] Moment of(const sphere::Piece& part, std::size_t row, std::uint32_t column) const {
    const std::size_t cell = source_is_row ? row : column;
    const sphere::Vec3 moment = sphere::moment(part, source->direction[cell]);
    return {dot(moment, source->first[cell]), dot(moment, source->second[cell])};
  }
};

/// Parts of one row's overlaps as they are found, in any order.
class Found {
 public:
  explicit Found(const MomentFrame& frame) : frame_(frame) {}
  [[nodiscard]] std::size_t size() const { return parts_.size(); }
  void shrink(std::size_t size) { parts_.resize(size); }
  /// `sign` is -1 for a part that is to be taken away.
  void add(const sphere::Piece& part, double area, std::size_t row, std::uint32_t column, double sign = 1) {
    Moment moment{};
    if (frame_.source != nullptr) moment = frame_.of(part, row, column);
    parts_.push_back({column, sign * area, {sign * moment[0], sign * moment[1]}});
  }
  /// Sums parts of the same column and appends them to `out` as one row, without slivers; empties this.
  void close_row(double sliver, Rows& out);

 private:
  struct Part {
    std::uint32_t column;
    double area;
    Moment moment;
  };
  const MomentFrame& frame_;
  std::vector<Part> parts_;
};

/// Closure bound of a cell, relative to its area: 1e-12 for the sums, 8 eps * perimeter for edges and their rounding.
inline double closure_bound(double perimeter, double area) {
  return 1e-12 + 8 * std::numeric_limits<double>::epsilon() * perimeter / area;
}

/// Overlaps below this times the cell's perimeter (rad) are rounding of an edge that two cells share, not cells that
/// overlap. Eight of them fit in the closure bound.
inline constexpr double kSliver = std::numeric_limits<double>::epsilon();

}  // namespace windrow::overlap
