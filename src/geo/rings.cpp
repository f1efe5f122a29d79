#include "rings.h"

#include <algorithm>
#include <cmath>

namespace windrow::geo {
namespace {

using Ring = mesh::PolygonCell::Ring;

/// Whole turns that bring `lon` within half a turn of `near`.
double turns_to(double lon, double near) { return 360 * std::round((near - lon) / 360); }

/// False when the ring does not come back to where it began.
bool unroll(Ring& ring) {
  if (ring.empty()) return true;
  const double first = ring.front()[0];
  for (std::size_t i = 1; i < ring.size(); ++i) {
    // Exactly half a turn may be meant either way: it is left as it is drawn.
    const double jump = ring[i][0] - ring[i - 1][0];
    if (std::abs(jump) > 180) ring[i][0] += turns_to(ring[i][0], ring[i - 1][0]);
  }
  return std::abs(ring.back()[0] - first) <= 180;
}

double middle(const Ring& ring) {
  const auto [low, high] =
      std::minmax_element(ring.begin(), ring.end(), [](const auto& a, const auto& b) { return a[0] < b[0]; });
  return ((*low)[0] + (*high)[0]) / 2;
}

}  // namespace

bool all_finite(const mesh::PolygonCell& cell) {
  for (const auto& part : cell.parts)
    for (const Ring& ring : part)
      for (const auto& [x, y] : ring)
        if (!std::isfinite(x) || !std::isfinite(y)) return false;
  return true;
}

std::optional<mesh::PolygonCell> unrolled(const mesh::PolygonCell& cell) {
  mesh::PolygonCell out = cell;
  for (auto& part : out.parts) {
    for (Ring& ring : part) {
      if (!unroll(ring)) return std::nullopt;
      if (ring.empty() || &ring == &part.front()) continue;
      const double shift = turns_to(middle(ring), middle(part.front()));
      for (auto& point : ring) point[0] += shift;
    }
  }
  return out;
}

}  // namespace windrow::geo
