// Places without area: sites and towns as a mesh.
#include <fmt/format.h>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {
namespace {

class PointMesh final : public Mesh {
 public:
  PointMesh(std::vector<GeoPoint> points, const Earth& earth) : points_(std::move(points)), earth_(earth) {}

  std::size_t size() const override { return points_.size(); }
  std::pair<std::size_t, std::size_t> shape() const override { return {1, points_.size()}; }
  sphere::Polygon cell(std::size_t /*index*/) const override { return {}; }
  double area(std::size_t /*index*/) const override { return 0; }
  double perimeter(std::size_t /*index*/) const override { return 0; }
  GeoPoint centre(std::size_t index) const override { return points_[index]; }
  std::optional<std::size_t> find(GeoPoint /*point*/) const override { return {}; }
  bool on_rim(std::size_t /*index*/) const override { return true; }
  bool has_area() const override { return false; }
  Earth earth() const override { return earth_; }
  codec::Digest digest() const override {
    codec::Hasher hasher;
    hasher.add(std::string("points"));
    for (const GeoPoint& p : points_) hasher.add(p.longitude.radians()).add(p.latitude.radians());
    return hasher.add(earth_.e2).finish();
  }
  std::string describe() const override { return fmt::format("{} points", points_.size()); }

 private:
  std::vector<GeoPoint> points_;
  Earth earth_;
};

}  // namespace

MeshPtr make_points(std::vector<GeoPoint> points, const Earth& earth) {
  return std::make_shared<PointMesh>(std::move(points), earth);
}

}  // namespace windrow::mesh
