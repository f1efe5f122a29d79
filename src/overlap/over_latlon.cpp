// One target cell after the other against a latitude-longitude source. Most cells of a fine mesh lie inside one source
// cell, usually the one before's: that is certified from the corners alone; only the rest is clipped.
#include "over_latlon.h"

#include <algorithm>

#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::overlap {
namespace {

using sphere::Piece;

bool holds(const Wedge& wedge, const Band& band, const Outline& outline) {
  return side_of(wedge.east_of_west, outline) == Side::inside && side_of(wedge.west_of_east, outline) == Side::inside &&
         (!band.has_south || side_of(band.north_of_south, outline) == Side::inside) &&
         (!band.has_north || side_of(band.south_of_north, outline) == Side::inside);
}

class CellOverlap {
 public:
  CellOverlap(const SourceBlock& source, const mesh::Mesh& target, const MomentFrame& frame)
      : source_(source), target_(target), moments_(frame.source != nullptr), found_(frame) {}

  void add(std::size_t index, Rows& rows) {
    if (hinted_ && !moments_ && inside_hint(index)) {
      rows.count.push_back(1);
      rows.pairings.push_back({column(hint_wedge_, hint_band_), target_.area(index)});
      rows.covered.push_back(1);
      rows.bound.push_back(0);  // one pairing, of the cell's own area
      return;
    }
    row_ = index;
    bool covered = true;
    target_.cell_into(index, polygon_);
    for (const Piece& piece : polygon_.pieces) {
      covered = add_piece(piece, polygon_.pieces.size() == 1 ? target_.area(index) : signed_area(piece)) && covered;
    }
    const double perimeter = sphere::perimeter(polygon_);
    found_.close_row(kSliver * perimeter, rows);
    rows.covered.push_back(covered ? 1 : 0);
    rows.bound.push_back(closure_bound(perimeter, target_.area(index)));
  }

 private:
  [[nodiscard]] std::uint32_t column(std::uint32_t wedge, std::uint32_t band) const {
    return band * source_.columns() + source_.wedge(wedge).column;
  }

  bool inside_hint(std::size_t index) {
    const std::optional<mesh::Hull> hull = target_.hull(index);
    if (!hull) return false;
    outline_.points.assign(hull->corner.begin(), hull->corner.end());
    outline_.margin = hull->margin;
    return holds(source_.wedge(hint_wedge_), source_.band(hint_band_), outline_);
  }

  // Returns whether the piece lies wholly within the source's extent.
  bool add_piece(const Piece& piece, double area) {
    outline_of(piece, outline_);
    source_.find(outline_, candidates_);
    const std::size_t before = found_.size();
    for (const std::uint32_t w : candidates_.wedges) {
      const Wedge& wedge = source_.wedge(w);
      bool clipped = false;
      const Piece* in_wedge = cut(piece, outline_, wedge.east_of_west, half_wedge_, clipped);
      if (in_wedge != nullptr) in_wedge = cut(*in_wedge, outline_, wedge.west_of_east, whole_wedge_, clipped);
      if (in_wedge == nullptr) continue;
      // A parallel can lie wholly inside a cell around a pole: only the outline of a part within a wedge tells sides.
      if (clipped) outline_of(*in_wedge, wedge_outline_);
      const Outline& outline = clipped ? wedge_outline_ : outline_;
      for (std::uint32_t b = candidates_.first_band; b < candidates_.last_band; ++b) {
        const Band& band = source_.band(b);
        bool banded = clipped;
        const Piece* part = in_wedge;
        if (band.has_south) part = cut(*part, outline, band.north_of_south, half_band_, banded);
        if (part != nullptr && band.has_north) part = cut(*part, outline, band.south_of_north, whole_band_, banded);
        if (part == nullptr) continue;
        if (!banded) {  // certified inside this one source cell: anything else found is rounding
          found_.shrink(before);
          found_.add(piece, area, row_, column(w, b));
          hinted_ = true;
          hint_wedge_ = w;
          hint_band_ = b;
          return true;
        }
        found_.add(*part, signed_area(*part), row_, column(w, b));
      }
    }
    return candidates_.covered;
  }

  // The part of `piece`, which lies within what is outlined, in the half-space; itself when nothing is cut, null when
  // nothing is left.
  static const Piece* cut(const Piece& piece, const Outline& outline, const sphere::Circle& half_space, Piece& out,
                          bool& clipped) {
    const Side side = side_of(half_space, outline);
    if (side == Side::inside) return &piece;
    if (side == Side::outside) return nullptr;
    clip(piece, half_space, out);
    clipped = true;
    return out.loops.empty() ? nullptr : &out;
  }

  const SourceBlock& source_;
  const mesh::Mesh& target_;
  bool moments_, hinted_ = false;
  std::size_t row_ = 0;
  std::uint32_t hint_wedge_ = 0, hint_band_ = 0;
  Outline outline_, wedge_outline_;
  Candidates candidates_;
  sphere::Polygon polygon_;
  Piece half_wedge_, whole_wedge_, half_band_, whole_band_;
  Found found_;
};

}  // namespace

Rows over_latlon(const SourceBlock& block, const mesh::Mesh& cells, const MomentFrame& frame, std::size_t first,
                 std::size_t last) {
  Rows rows;
  CellOverlap overlap(block, cells, frame);
  for (std::size_t index = first; index < last; ++index) overlap.add(index, rows);
  return rows;
}

}  // namespace windrow::overlap
