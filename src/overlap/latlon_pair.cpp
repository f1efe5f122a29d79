// Interval overlaps along each axis, and their products.
#include "latlon_pair.h"

#include <algorithm>
#include <cmath>

namespace windrow::overlap {
namespace {

double radians(double degrees) { return Angle::degrees(degrees).radians(); }

// Edges of up to 360 degrees that mean the same number differ by a rounding or two of 360: no overlap below this.
constexpr double kSameEdge_deg = 2 * std::numeric_limits<double>::epsilon() * 360;

std::vector<double> on_sphere(const mesh::Mesh& mesh) {
  std::vector<double> lat = mesh.latlon()->lat_deg;
  for (double& phi : lat) phi = mesh::authalic_latitude_deg(phi, mesh.earth().e2);
  return lat;
}

}  // namespace

LatLonPair::LatLonPair(const mesh::Mesh& source, const mesh::Mesh& target)
    : target_(target),
      columns_(target.latlon()->lon_deg.size() - 1),
      source_columns_(source.latlon()->lon_deg.size() - 1),
      lon_(longitudes(*source.latlon(), target.latlon()->lon_deg)),
      lat_(latitudes(on_sphere(source), on_sphere(target))) {}

LatLonPair::Axis LatLonPair::longitudes(const mesh::LatLonEdges& grid, const std::vector<double>& target) {
  const std::vector<double>& source = grid.lon_deg;
  Axis axis;
  for (std::size_t i = 0; i + 1 < target.size(); ++i) {
    const double west = target[i];
    const double east = target[i + 1];
    std::vector<Part> parts;
    const auto first_turn = static_cast<long>(std::floor((west - source.back()) / 360));
    const auto last_turn = static_cast<long>(std::ceil((east - source.front()) / 360));
    for (long turn = first_turn; turn <= last_turn; ++turn) {
      const double shift = 360.0 * static_cast<double>(turn);
      const auto above = std::upper_bound(source.begin(), source.end(), west - shift);
      auto k = static_cast<std::size_t>(above == source.begin() ? 0 : above - source.begin() - 1);
      for (; k + 1 < source.size() && source[k] + shift < east; ++k) {
        const double overlap = std::min(east, source[k + 1] + shift) - std::max(west, source[k] + shift);
        if (overlap <= kSameEdge_deg) continue;
        const auto column = static_cast<std::uint32_t>(k);
        const auto same = std::find_if(parts.begin(), parts.end(), [&](const Part& p) { return p.source == column; });
        if (same != parts.end()) {
          same->size += radians(overlap);
        } else {
          parts.push_back({column, radians(overlap)});
        }
      }
    }
    std::sort(parts.begin(), parts.end(), [](const Part& a, const Part& b) { return a.source < b.source; });
    bool covered = mesh::all_round(grid);
    for (long turn = first_turn; turn <= last_turn && !covered; ++turn) {
      const double shift = 360.0 * static_cast<double>(turn);
      covered = west >= source.front() + shift && east <= source.back() + shift;
    }
    axis.parts.push_back(std::move(parts));
    axis.covered.push_back(covered ? 1 : 0);
  }
  return axis;
}

LatLonPair::Axis LatLonPair::latitudes(const std::vector<double>& source, const std::vector<double>& target) {
  Axis axis;
  for (std::size_t j = 0; j + 1 < target.size(); ++j) {
    std::vector<Part> parts;
    const auto above = std::upper_bound(source.begin(), source.end(), target[j]);
    auto k = static_cast<std::size_t>(above == source.begin() ? 0 : above - source.begin() - 1);
    for (; k + 1 < source.size() && source[k] < target[j + 1]; ++k) {
      const double south = std::max(target[j], source[k]);
      const double north = std::min(target[j + 1], source[k + 1]);
      if (north - south <= kSameEdge_deg) continue;
      // Difference of sines without cancellation.
      const double size = 2 * std::cos(radians(0.5 * (south + north))) * std::sin(radians(0.5 * (north - south)));
      parts.push_back({static_cast<std::uint32_t>(k), size});
    }
    axis.covered.push_back(target[j] >= source.front() && target[j + 1] <= source.back() ? 1 : 0);
    axis.parts.push_back(std::move(parts));
  }
  return axis;
}

Rows LatLonPair::rows(std::size_t first, std::size_t last) const {
  Rows out;
  for (std::size_t index = first; index < last; ++index) {
    const std::size_t j = index / columns_, i = index % columns_;
    for (const Part& row : lat_.parts[j]) {
      for (const Part& column : lon_.parts[i]) {
        out.pairings.push_back(
            {static_cast<std::uint32_t>(row.source * source_columns_ + column.source), row.size * column.size});
      }
    }
    out.count.push_back(static_cast<std::uint32_t>(lat_.parts[j].size() * lon_.parts[i].size()));
    out.covered.push_back(lat_.covered[j] && lon_.covered[i] ? 1 : 0);
    out.bound.push_back(closure_bound(target_.perimeter(index), target_.area(index)));
  }
  return out;
}

}  // namespace windrow::overlap
