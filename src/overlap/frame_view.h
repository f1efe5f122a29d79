// A mesh seen in the frame of a rotated grid: cells turned, numbers kept.
#pragma once
#include "windrow/mesh/frame.h"
#include "windrow/mesh/mesh.h"

namespace windrow::overlap {

class FrameView final : public mesh::Mesh {
 public:
  FrameView(const mesh::Mesh& mesh, const mesh::Rotation& rotation) : mesh_(mesh), frame_(rotation) {}
  std::size_t size() const override { return mesh_.size(); }
  std::pair<std::size_t, std::size_t> shape() const override { return mesh_.shape(); }
  sphere::Polygon cell(std::size_t index) const override {
    sphere::Polygon out;
    cell_into(index, out);
    return out;
  }
  void cell_into(std::size_t index, sphere::Polygon& out) const override {
    mesh_.cell_into(index, out);
    frame_.to_frame(out);
  }
  std::optional<mesh::Hull> hull(std::size_t index) const override {
    std::optional<mesh::Hull> out = mesh_.hull(index);
    if (out) {
      for (sphere::Vec3& corner : out->corner) corner = frame_.to_frame(corner);
    }
    return out;
  }
  double area(std::size_t index) const override { return mesh_.area(index); }
  double perimeter(std::size_t index) const override { return mesh_.perimeter(index); }
  GeoPoint centre(std::size_t index) const override { return mesh_.centre(index); }
  std::optional<std::size_t> find(GeoPoint point) const override { return mesh_.find(point); }
  bool on_rim(std::size_t index) const override { return mesh_.on_rim(index); }
  codec::Digest digest() const override { return mesh_.digest(); }
  std::string describe() const override { return mesh_.describe(); }

 private:
  const mesh::Mesh& mesh_;
  mesh::Frame frame_;
};

}  // namespace windrow::overlap
