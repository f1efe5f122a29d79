// A latitude-longitude source as wedges between meridians and bands between parallels, with its candidate search.
#pragma once
#include <cstdint>
#include <vector>

#include "outline.h"
#include "windrow/mesh/mesh.h"

namespace windrow::overlap {

/// Part of a source column at most 90 degrees wide, as two half-spaces.
struct Wedge {
  std::uint32_t column;
  sphere::Circle east_of_west, west_of_east;
};

/// A source row as two half-spaces; the one at a pole is left out.
struct Band {
  bool has_south, has_north;
  sphere::Circle north_of_south, south_of_north;
};

/// What may overlap a region, and whether the region lies wholly within the source's extent.
struct Candidates {
  std::vector<std::uint32_t> wedges;
  std::uint32_t first_band = 0, last_band = 0;  ///< [first, last)
  bool covered = false;
};

class SourceBlock {
 public:
  explicit SourceBlock(const mesh::Mesh& source);
  /// All wedges and bands that touch the cap around the outline.
  void find(const Outline& outline, Candidates& out) const;
  [[nodiscard]] const Wedge& wedge(std::uint32_t k) const { return wedges_[k]; }
  [[nodiscard]] const Band& band(std::uint32_t k) const { return bands_[k]; }
  [[nodiscard]] std::uint32_t columns() const { return columns_; }

 private:
  std::vector<Wedge> wedges_;
  std::vector<double> wedge_edges_deg_;  // ascending, wedges + 1
  std::vector<Band> bands_;
  std::vector<double> band_edges_deg_;  // on the unit sphere
  std::uint32_t columns_ = 0;
  bool all_round_ = false;
};

}  // namespace windrow::overlap
