// One cell after the other against the cells of another mesh near it. Cells of a fine mesh inside the same cell as the
// one before are certified from their corners alone; only the rest is clipped.
#include "over_cells.h"

#include <algorithm>
#include <memory>

#include "convex.h"
#include "windrow/sphere/clip.h"

namespace windrow::overlap {
namespace {

using sphere::Piece;

// Cells of the clipping mesh taken apart, the latest few: neighbours meet the same ones again.
class PartsStore {
 public:
  explicit PartsStore(const mesh::Mesh& mesh) : mesh_(mesh), slots_(std::size_t{1} << kSlotBits) {}
  struct Slot {
    bool held = false;
    std::uint32_t cell = 0;
    CellParts parts;
    sphere::Polygon polygon;
  };
  Slot& of(std::uint32_t cell) {
    // Multiplied (Knuth 1998, 6.4), so that cells whose numbers differ by a power of two do not drive each other out.
    Slot& slot = slots_[(cell * 2654435761U) >> (32 - kSlotBits)];
    if (!slot.held || slot.cell != cell) {
      mesh_.cell_into(cell, slot.polygon);
      find_sides(slot.polygon, slot.parts);
      slot.cell = cell;
      slot.held = true;
    }
    return slot;
  }

 private:
  static constexpr unsigned kSlotBits = 13;
  const mesh::Mesh& mesh_;
  std::vector<Slot> slots_;
};

class CellOverlap {
 public:
  CellOverlap(const mesh::Mesh& clip, const mesh::Index& index, const mesh::Mesh& cells, const MomentFrame& frame)
      : clip_(clip), index_(index), cells_(cells), moments_(frame.source != nullptr), parts_(clip), found_(frame) {}

  Rows rows(std::size_t first, std::size_t last) {
    hinted_ = false;  // so that bits do not depend on what this thread did before
    Rows rows;
    for (std::size_t row = first; row < last; ++row) add_row(row, rows);
    return rows;
  }

 private:
  void add_row(std::size_t row, Rows& rows) {
    if (hinted_ && !moments_ && inside_hint(row)) {
      rows.count.push_back(1);
      rows.pairings.push_back({hint_, cells_.area(row)});
      rows.covered.push_back(1);
      rows.bound.push_back(0);  // one pairing, of the cell's own area
      return;
    }
    hinted_ = false;
    cells_.cell_into(row, polygon_);
    index_.find(mesh::box_of(polygon_), candidates_);
    const double whole = cells_.area(row);
    bool covered = polygon_.pieces.size() == 1;  // of several pieces one might lie outside unseen
    for (const Piece& piece : polygon_.pieces) add_piece(piece, polygon_.pieces.size() == 1 ? whole : 0, row);
    const double perimeter = sphere::perimeter(polygon_);
    found_.close_row(kSliver * perimeter, rows);
    const std::uint32_t count = rows.count.back();
    for (std::size_t p = rows.pairings.size() - count; p < rows.pairings.size(); ++p) {
      covered = covered && !clip_.on_rim(rows.pairings[p].column);
    }
    rows.covered.push_back(covered && count > 0 ? 1 : 0);
    rows.bound.push_back(closure_bound(perimeter, whole));
  }

  bool inside_hint(std::size_t row) {
    const std::optional<mesh::Hull> hull = cells_.hull(row);
    if (!hull) return false;
    outline_.points.assign(hull->corner.begin(), hull->corner.end());
    outline_.margin = hull->margin;
    return place(parts_.of(hint_).parts.core, outline_) == Side::inside;
  }

  void add_piece(const Piece& piece, double whole, std::size_t row) {
    outline_of(piece, outline_);
    own_known_ = false;
    for (const std::uint32_t cell : candidates_) {
      PartsStore::Slot& other = parts_.of(cell);
      const Side where = other.parts.core.empty() ? Side::across : place(other.parts.core, outline_);
      if (where == Side::inside) {
        found_.add(piece, whole == 0 ? signed_area(piece) : whole, row, cell);
        hinted_ = true;
        hint_ = cell;
      } else if (other.parts.convex) {
        if (where == Side::across) add(cut(piece), row, cell, 1);
      } else if (convex(piece)) {
        add_turned(other.polygon, row, cell);
      } else {
        add_apart(piece, other, row, cell);
      }
    }
  }

  // Where the outlined region is with respect to the common part of the half-spaces; `across_` holds what cuts it.
  Side place(const std::vector<sphere::Circle>& sides, const Outline& outline) {
    across_.clear();
    for (const sphere::Circle& side : sides) {
      const Side where = side_of_region(side, outline);
      if (where == Side::outside) return where;
      if (where == Side::across) across_.push_back(&side);
    }
    return across_.empty() ? Side::inside : Side::across;
  }

  // The part of the piece within all half-spaces of `across_`; null when nothing is left.
  const Piece* cut(const Piece& piece) {
    const Piece* left = &piece;
    Piece* into = &one_;
    for (const sphere::Circle* side : across_) {
      clip(*left, *side, *into);
      if (into->loops.empty()) return nullptr;
      left = into;
      into = into == &one_ ? &other_ : &one_;
    }
    return left;
  }

  void add(const Piece* part, std::size_t row, std::uint32_t cell, double sign) {
    if (part != nullptr) found_.add(*part, signed_area(*part), row, cell, sign);
  }

  bool convex(const Piece& piece) {
    if (!own_known_) {
      own_polygon_.pieces.assign(1, piece);
      find_sides(own_polygon_, own_);
      own_known_ = true;
    }
    return own_.convex;
  }

  // The other way round: a cell that would have to be taken apart is cut by the sides of the piece, which is convex.
  void add_turned(const sphere::Polygon& polygon, std::size_t row, std::uint32_t cell) {
    for (const Piece& part : polygon.pieces) {
      outline_of(part, other_outline_);
      if (place(own_.core, other_outline_) != Side::outside) add(cut(part), row, cell, 1);
    }
  }

  void add_apart(const Piece& piece, PartsStore::Slot& other, std::size_t row, std::uint32_t cell) {
    if (other.parts.used == 0) take_apart(other.polygon, other.parts);
    for (std::size_t k = 0; k < other.parts.used; ++k) {
      const ConvexPart& part = other.parts.parts[k];
      if (place(part.sides, outline_) != Side::outside) add(cut(piece), row, cell, part.sign);
    }
  }

  const mesh::Mesh& clip_;
  const mesh::Index& index_;
  const mesh::Mesh& cells_;
  bool moments_, hinted_ = false;
  std::uint32_t hint_ = 0;
  PartsStore parts_;
  Outline outline_, other_outline_;
  sphere::Polygon polygon_, own_polygon_;
  CellParts own_;
  bool own_known_ = false;
  std::vector<std::uint32_t> candidates_;
  std::vector<const sphere::Circle*> across_;
  Piece one_, other_;
  Found found_;
};

}  // namespace

std::function<Rows(std::size_t first, std::size_t last)> over_cells(const mesh::Mesh& clip, const mesh::Index& index,
                                                                    const mesh::Mesh& cells, const MomentFrame& frame) {
  const auto overlap = std::make_shared<CellOverlap>(clip, index, cells, frame);
  return [overlap](std::size_t first, std::size_t last) { return overlap->rows(first, last); };
}

}  // namespace windrow::overlap
