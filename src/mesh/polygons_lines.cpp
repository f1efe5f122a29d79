// Vertices and lines found again by their coordinates' bits, and what cancels within one polygon.
#include "polygons_lines.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <numeric>

namespace windrow::mesh::polygons {
namespace {

// Exact: the remainder is, and so is a difference of numbers within a factor of two of each other.
double within_half_turn(double x) {
  x = std::fmod(x, 360.0);
  if (x >= 180) x -= 360;
  if (x < -180) x += 360;
  return x;
}

}  // namespace

std::uint32_t Lines::vertex(double x, double y) {
  if (geographic_) x = within_half_turn(x);
  x += 0.0;  // -0 and 0 are one place
  y += 0.0;
  const auto [at, added] = vertex_number_.try_emplace(
      {std::bit_cast<std::uint64_t>(x), std::bit_cast<std::uint64_t>(y)}, static_cast<std::uint32_t>(vertex_.size()));
  if (added) vertex_.push_back({x, y});
  return at->second;
}

// From the vertices' own coordinates, so that a neighbour drawn a turn apart gets the same bits; half a turn goes the
// way it was drawn.
double Lines::step_dx(std::uint32_t a, std::uint32_t b, double drawn_dx) const {
  double dx = vertex_[b][0] - vertex_[a][0];
  if (!geographic_) return dx;
  if (dx > 180) dx -= 360;
  if (dx < -180) dx += 360;
  return std::abs(dx) == 180 && drawn_dx == -dx ? -dx : dx;
}

Outline Lines::add(const PolygonCell::Ring& ring) {
  Outline out;
  double turned = 0;
  double x = 0;  // from the first vertex
  const double y0 = ring.empty() ? 0 : ring.front()[1];
  for (std::size_t k = 0; k < ring.size(); ++k) {
    const auto& next = ring[(k + 1) % ring.size()];
    const std::uint32_t a = vertex(ring[k][0], ring[k][1]);
    const std::uint32_t b = vertex(next[0], next[1]);
    if (a == b) continue;
    const double dx = step_dx(a, b, next[0] - ring[k][0]);
    const bool against = vertex_[b] < vertex_[a];
    const std::uint32_t from = against ? b : a, to = against ? a : b;
    const double line_dx = against ? -dx : dx;
    const std::array<std::uint64_t, 2> key{std::uint64_t{from} << 32 | to, line_dx == -180 ? 1U : 0U};
    const auto [at, added] = line_number_.try_emplace(key, static_cast<std::uint32_t>(line_.size()));
    if (added) line_.push_back({from, to, line_dx});
    out.steps.push_back({at->second, against});
    out.flat_area += 0.5 * (x * (next[1] - y0) - (x + dx) * (ring[k][1] - y0));
    x += dx;
    turned += dx;
  }
  if (geographic_) out.winding = static_cast<int>(std::lround(turned / 360));
  return out;
}

std::vector<std::vector<Step>> boundary(const std::vector<Outline>& part) {
  std::vector<Step> step;
  std::vector<std::size_t> next, previous;
  for (const Outline& ring : part) {
    const std::size_t first = step.size(), count = ring.steps.size();
    step.insert(step.end(), ring.steps.begin(), ring.steps.end());
    for (std::size_t k = 0; k < count; ++k) {
      next.push_back(first + (k + 1) % count);
      previous.push_back(first + (k + count - 1) % count);
    }
  }
  std::vector<std::size_t> order(step.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(),
                   [&](std::size_t a, std::size_t b) { return step[a].line < step[b].line; });
  std::vector<bool> gone(step.size());
  for (std::size_t k = 0; k + 1 < order.size(); ++k) {
    const std::size_t a = order[k], b = order[k + 1];
    if (gone[a] || step[a].line != step[b].line || step[a].against == step[b].against) continue;
    gone[a] = gone[b] = true;
    // What led to one goes on after the other.
    const std::size_t before_a = previous[a], after_a = next[a], before_b = previous[b], after_b = next[b];
    next[before_a] = after_b;
    previous[after_b] = before_a;
    next[before_b] = after_a;
    previous[after_a] = before_b;
  }
  std::vector<std::vector<Step>> loops;
  for (std::size_t k = 0; k < step.size(); ++k) {
    if (gone[k]) continue;
    loops.emplace_back();
    for (std::size_t at = k; !gone[at]; at = next[at]) {
      gone[at] = true;
      loops.back().push_back(step[at]);
    }
  }
  return loops;
}

}  // namespace windrow::mesh::polygons
