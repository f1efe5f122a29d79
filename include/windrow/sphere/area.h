// Areas on the unit sphere: signed fan of geodesic triangles plus one lens for every edge that is no great circle.
#pragma once
#include "windrow/sphere/polygon.h"

namespace windrow::sphere {

/// Area (sr) between a positive arc of `dtheta` on `circle` and its geodesic chord; odd in dtheta and in d. Closed form
/// dtheta (1-d) - 2 atan2(t sin dtheta, 1 + t cos dtheta), t = (1-d)/(1+d); below 0.05 rad its series (see area.cpp).
double lens_area(const Circle& circle, double dtheta);

/// Signed area of the geodesic triangle a, b, c: Van Oosterom & Strackee 1983 (IEEE Trans. Biomed. Eng. 30, 125), with
/// the numerator from differences, so that the relative error stays near eps for small triangles.
double triangle_area(const Vec3& a, const Vec3& b, const Vec3& c);

/// Signed area of a loop, in (-2 pi, 2 pi]: positive for an anticlockwise loop of less than a hemisphere.
double loop_area(const Loop& loop);

/// Sum of the signed loops; never raised by 4 pi: for pieces of less than a hemisphere, where slivers may be a few
/// eps * perimeter below zero.
double signed_area(const Piece& piece);

/// Area in [0, 4 pi): signed loops modulo 4 pi, summed over the pieces. Error: a few eps * perimeter.
double area(const Polygon& polygon);

/// Length of all edges (rad). Seams between pieces of one polygon count too.
double perimeter(const Polygon& polygon);

/// First moment: the integral of x dA over the region, from the vector area of its boundary (half the sum of y x dy, y =
/// x - origin; the gap between an arc and its chord is a plane segment). Along `origin` it is close to the area; across,
/// it is accurate relative to (extent of the region)³ when `origin` lies in or near it.
Vec3 moment(const Piece& piece, const Vec3& origin);

}  // namespace windrow::sphere
