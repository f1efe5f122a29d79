// Octants, by clipping with one plane after another.
#include "polygons_cut.h"

#include <algorithm>
#include <array>

#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh::polygons {
namespace {

using sphere::Piece;
using sphere::Vec3;

constexpr std::array<Vec3, 3> kAxes = {Vec3{1, 0, 0}, Vec3{0, 1, 0}, Vec3{0, 0, 1}};
constexpr double kNarrow = 0.70710678118654752;  // cosine of 45 degrees
constexpr double kOffPlane = 1e-9;               // rad: clearly on one side
constexpr double kNothing = 1e-15;               // sr, 0.04 m2: what rounding leaves of a side on a plane

bool straddles(const Piece& region, const Vec3& axis) {
  bool before = false, behind = false;
  for (const sphere::Loop& loop : region.loops) {
    for (const sphere::Arc& arc : loop) {
      before = before || dot(axis, arc.from) > kOffPlane;
      behind = behind || dot(axis, arc.from) < -kOffPlane;
    }
  }
  return before && behind;
}

}  // namespace

bool too_wide(const Piece& region) {
  Vec3 sum;
  for (const sphere::Loop& loop : region.loops) {
    for (const sphere::Arc& arc : loop) sum = sum + arc.from;
  }
  if (!(norm(sum) > 0)) return true;
  const Vec3 middle = unit(sum);
  return std::any_of(region.loops.begin(), region.loops.end(), [&](const sphere::Loop& loop) {
    return std::any_of(loop.begin(), loop.end(),
                       [&](const sphere::Arc& arc) { return dot(middle, arc.from) < kNarrow; });
  });
}

std::vector<Vec3> axis_crossings(const sphere::Arc& arc) {
  std::vector<Vec3> out;
  for (const Vec3& axis : kAxes) {
    const double a = dot(axis, arc.from), b = dot(axis, arc.to);
    if (!(std::min(a, b) < -sphere::kOnCircle && std::max(a, b) > sphere::kOnCircle)) continue;
    const sphere::Circle plane = sphere::Circle::great(axis);
    const sphere::Crossings both = crossings(arc.dtheta > 0 ? arc.circle : arc.circle.reversed(), plane);
    const Vec3 x = a > 0 ? both.leaving : both.entering;
    if (norm(x - arc.from) > sphere::kOnCircle && norm(x - arc.to) > sphere::kOnCircle) out.push_back(x);
  }
  std::sort(out.begin(), out.end(),
            [&](const Vec3& p, const Vec3& q) { return norm(p - arc.from) < norm(q - arc.from); });
  const auto same = [](const Vec3& p, const Vec3& q) { return norm(p - q) <= sphere::kOnCircle; };
  out.erase(std::unique(out.begin(), out.end(), same), out.end());
  return out;
}

std::vector<Piece> octants(const Piece& region) {
  // A plane that the boundary passes through comes first: it parts the region into halves that fit a hemisphere, where
  // clipping can tell inside from outside even if a later plane meets no boundary.
  std::array<Vec3, 3> axes = kAxes;
  std::stable_partition(axes.begin(), axes.end(), [&](const Vec3& axis) { return straddles(region, axis); });
  std::vector<Piece> pieces = {region};
  for (const Vec3& axis : axes) {
    std::vector<Piece> halves;
    for (const Piece& piece : pieces) {
      for (const Vec3& n : {axis, -axis}) {
        Piece half;
        clip(piece, sphere::Circle::great(n), half);
        if (!half.loops.empty() && sphere::signed_area(half) > kNothing) halves.push_back(std::move(half));
      }
    }
    pieces = std::move(halves);
  }
  return pieces;
}

}  // namespace windrow::mesh::polygons
