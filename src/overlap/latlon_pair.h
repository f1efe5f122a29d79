// Two latitude-longitude grids need no clipping: overlaps are products of overlaps in longitude and in sin(latitude).
#pragma once
#include "pairings.h"
#include "windrow/mesh/mesh.h"

namespace windrow::overlap {

class LatLonPair {
 public:
  LatLonPair(const mesh::Mesh& source, const mesh::Mesh& target);
  [[nodiscard]] Rows rows(std::size_t first, std::size_t last) const;

 private:
  /// Overlap of one target interval with one source interval: radians of longitude, or a difference of sines.
  struct Part {
    std::uint32_t source;
    double size;
  };
  struct Axis {
    std::vector<std::vector<Part>> parts;  // one list a target interval, sources ascending
    std::vector<std::uint8_t> covered;
  };
  static Axis longitudes(const mesh::LatLonEdges& source, const std::vector<double>& target);
  static Axis latitudes(const std::vector<double>& source, const std::vector<double>& target);

  const mesh::Mesh& target_;
  std::size_t columns_, source_columns_;
  Axis lon_, lat_;
};

}  // namespace windrow::overlap
