// Where cells have their centres on the unit sphere: one place for the step from a mesh's latitudes to the sphere's.
#pragma once
#include <vector>

#include "windrow/mesh/mesh.h"
#include "windrow/sphere/vec3.h"

namespace windrow::overlap {

/// A position as the mesh's earth understands it, on the unit sphere.
sphere::Vec3 on_sphere(const GeoPoint& point, const mesh::Earth& earth);

/// Centres of all cells on the unit sphere.
std::vector<sphere::Vec3> sphere_centres(const mesh::Mesh& mesh);

/// Any two unit tangents at `direction` that make a right-handed frame with it; the same bits for the same direction.
void tangents(const sphere::Vec3& direction, sphere::Vec3& first, sphere::Vec3& second);

}  // namespace windrow::overlap
