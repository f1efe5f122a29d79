// Between the unit sphere of areas and positions on the earth: places of directions, tangents of the surface.
#pragma once
#include <optional>

#include "windrow/mesh/projector.h"
#include "windrow/sphere/vec3.h"

namespace windrow::mesh {

/// Direction on the unit sphere (where latitudes are authalic) of a position in the mesh's own latitude.
sphere::Vec3 direction_of(const GeoPoint& position, const Earth& earth);
sphere::Vec3 direction_degrees(double longitude, double latitude, const Earth& earth);

/// The way back: the mesh's own latitude of a vector of any length.
GeoPoint position_of(const sphere::Vec3& direction, const Earth& earth);

/// Unit tangent of the earth's surface at `at`, along the line from one position to the other. It stands upright on
/// sphere::point(at), the surface's normal there. Nothing when the line has no length along the surface.
std::optional<sphere::Vec3> tangent_between(const GeoPoint& from, const GeoPoint& to, const GeoPoint& at,
                                            const Earth& earth);

}  // namespace windrow::mesh
