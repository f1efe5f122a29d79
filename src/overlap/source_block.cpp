// Wedges, bands and the search for those near a cell. No clipping.
#include "source_block.h"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace windrow::overlap {
namespace {

using sphere::Vec3;

double degrees(double radians) { return Angle::radians(radians).degrees(); }

// Caps and angles are rounded outwards by this (degrees; 0.1 mm): a candidate too many costs time only.
constexpr double kOutward_deg = 1e-9;

}  // namespace

SourceBlock::SourceBlock(const mesh::Mesh& source) {
  const mesh::LatLonEdges& edges = *source.latlon();
  const double e2 = source.earth().e2;
  all_round_ = mesh::all_round(edges);
  columns_ = static_cast<std::uint32_t>(edges.lon_deg.size() - 1);
  wedge_edges_deg_.push_back(edges.lon_deg.front());
  for (std::uint32_t i = 0; i < columns_; ++i) {
    const double west = edges.lon_deg[i];
    const double width = edges.lon_deg[i + 1] - west;
    const int parts = static_cast<int>(std::ceil(width / 90));
    for (int k = 1; k <= parts; ++k) {
      const double start = wedge_edges_deg_.back();
      const double end = k == parts ? edges.lon_deg[i + 1] : west + width * k / parts;
      wedges_.push_back({i, sphere::Circle::meridian_degrees(start), sphere::Circle::meridian_degrees(end).reversed()});
      wedge_edges_deg_.push_back(end);
    }
  }
  // On the seam both ends are the same meridian, to the bit.
  if (all_round_) wedges_.back().west_of_east = wedges_.front().east_of_west.reversed();
  for (const double phi : edges.lat_deg) band_edges_deg_.push_back(mesh::authalic_latitude_deg(phi, e2));
  for (std::size_t j = 0; j + 1 < band_edges_deg_.size(); ++j) {
    const double south = band_edges_deg_[j];
    const double north = band_edges_deg_[j + 1];
    bands_.push_back({south > -90, north < 90, sphere::Circle::parallel_degrees(south),
                      sphere::Circle::parallel_degrees(north).reversed()});
  }
}

void SourceBlock::find(const Outline& outline, Candidates& out) const {
  Vec3 sum;
  for (const Vec3& p : outline.points) sum = sum + p;
  const Vec3 centre = sphere::unit(sum);
  double chord = 0;
  for (const Vec3& p : outline.points) chord = std::max(chord, norm(p - centre));
  const double radius = 2 * std::asin(std::min(1.0, 0.5 * (chord + outline.margin)));
  const double phi = degrees(std::atan2(centre.z, std::hypot(centre.x, centre.y)));
  const double south = phi - degrees(radius) - kOutward_deg;
  const double north = phi + degrees(radius) + kOutward_deg;

  const auto& lat = band_edges_deg_;
  const auto above = std::upper_bound(lat.begin(), lat.end(), south);
  const auto beyond = std::lower_bound(lat.begin(), lat.end(), north);
  out.first_band = above == lat.begin() ? 0 : static_cast<std::uint32_t>(above - lat.begin()) - 1;
  out.last_band = std::min(static_cast<std::uint32_t>(beyond - lat.begin()), static_cast<std::uint32_t>(bands_.size()));
  out.covered = (south >= lat.front() || lat.front() == -90) && (north <= lat.back() || lat.back() == 90);

  out.wedges.clear();
  const auto all = static_cast<std::uint32_t>(wedges_.size());
  if (south <= -90 || north >= 90) {  // the cap holds a pole, where all meridians meet
    for (std::uint32_t k = 0; k < all; ++k) out.wedges.push_back(k);
    out.covered = out.covered && all_round_;
    return;
  }
  const double half_width =
      degrees(std::asin(std::min(1.0, std::sin(radius) / std::cos(Angle::degrees(phi).radians())))) + kOutward_deg;
  const auto& lon = wedge_edges_deg_;
  double lambda = degrees(std::atan2(centre.y, centre.x));
  lambda += 360 * std::ceil((lon.front() - lambda) / 360);  // within a turn from the block's west edge
  bool within = all_round_;
  for (const double turn : {0.0, -360.0, 360.0}) {
    const double west = lambda + turn - half_width;
    const double east = lambda + turn + half_width;
    if (east < lon.front() || west > lon.back()) continue;
    within = within || (west >= lon.front() && east <= lon.back());
    const auto first = std::upper_bound(lon.begin(), lon.end(), west);
    const auto last = std::lower_bound(lon.begin(), lon.end(), east);
    const auto begin = first == lon.begin() ? 0 : static_cast<std::uint32_t>(first - lon.begin()) - 1;
    const auto end = std::min(static_cast<std::uint32_t>(last - lon.begin()), all);
    for (std::uint32_t k = begin; k < end; ++k) out.wedges.push_back(k);
  }
  // A wide cap can meet one wedge from both sides of the globe.
  std::sort(out.wedges.begin(), out.wedges.end());
  out.wedges.erase(std::unique(out.wedges.begin(), out.wedges.end()), out.wedges.end());
  out.covered = out.covered && within;
}

}  // namespace windrow::overlap
