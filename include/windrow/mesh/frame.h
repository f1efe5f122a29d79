// Turning between a rotated-pole frame and the geographic one: a matrix, so that nothing is special at either pole.
#pragma once
#include "windrow/mesh/cell_records.h"
#include "windrow/sphere/polygon.h"

namespace windrow::mesh {

/// The axes of a rotated frame, in geographic components. The same vector gives the same bits each time, so what cells
/// share in one frame they share in the other.
class Frame {
 public:
  explicit Frame(const Rotation& rotation);
  [[nodiscard]] sphere::Vec3 to_frame(const sphere::Vec3& geographic) const {
    return {dot(x_, geographic), dot(y_, geographic), dot(z_, geographic)};
  }
  [[nodiscard]] sphere::Vec3 from_frame(const sphere::Vec3& own) const { return own.x * x_ + own.y * y_ + own.z * z_; }
  /// Vertices and normals of circles of a whole region.
  void to_frame(sphere::Polygon& polygon) const;
  void from_frame(sphere::Polygon& polygon) const;

 private:
  sphere::Vec3 x_, y_, z_;
};

}  // namespace windrow::mesh
