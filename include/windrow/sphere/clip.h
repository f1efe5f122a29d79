// Clipping of regions by half-spaces n.x >= d, and points in regions. All functions are pure.
#pragma once
#include <limits>

#include "windrow/sphere/polygon.h"

namespace windrow::sphere {

/// A vertex within this distance (rad) of a circle lies on it, and on-circle vertices count as inside of both sides.
/// Rounding of a unit vector and of a circle moves a vertex by up to 2 eps each. Moving a vertex so far changes an area
/// by at most kOnCircle * perimeter, half the closure bound of a cell (8 eps * perimeter).
inline constexpr double kOnCircle = 4 * std::numeric_limits<double>::epsilon();

/// The two points where circles cross, computed from the unordered pair: either order gives the same bits. The first
/// is the one where `a` leaves the left side of `b` (height falls along a). For circles that do not
/// cross, both are the nearest point of the line of closest approach.
struct Crossings {
  Vec3 leaving, entering;
};
Crossings crossings(const Circle& a, const Circle& b);

/// The part of `piece` (under a hemisphere) with n.x >= d, appended to `out` (which is cleared first). Several loops
/// may result. Law: area(clip by H) + area(clip by reversed H) = area, within a few kOnCircle * perimeter.
void clip(const Piece& piece, const Circle& half_space, Piece& out);

/// Is the point inside the region (under a hemisphere)? Points within rounding of an edge may go either way.
bool contains(const Piece& piece, const Vec3& point);

}  // namespace windrow::sphere
