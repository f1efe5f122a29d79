// Rotated-pole frames: the turning itself, projectors for it, and latitude-longitude cells seen from outside.
#include <fmt/format.h>

#include <cmath>

#include "surface.h"
#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/mesh/frame.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

template <typename Turn>
void turn(sphere::Polygon& polygon, Turn&& turned) {
  for (sphere::Piece& piece : polygon.pieces) {
    for (sphere::Loop& loop : piece.loops) {
      for (sphere::Arc& arc : loop) {
        arc.from = turned(arc.from);
        arc.to = turned(arc.to);
        arc.circle.n = turned(arc.circle.n);
      }
    }
  }
}

class RotatedMesh final : public Mesh {
 public:
  RotatedMesh(MeshPtr own, const Rotation& rotation) : own_(std::move(own)), rotation_(rotation), frame_(rotation) {}

  std::size_t size() const override { return own_->size(); }
  std::pair<std::size_t, std::size_t> shape() const override { return own_->shape(); }
  sphere::Polygon cell(std::size_t index) const override {
    sphere::Polygon out;
    cell_into(index, out);
    return out;
  }
  void cell_into(std::size_t index, sphere::Polygon& out) const override {
    own_->cell_into(index, out);
    frame_.from_frame(out);
  }
  double area(std::size_t index) const override { return own_->area(index); }
  double perimeter(std::size_t index) const override { return own_->perimeter(index); }
  GeoPoint centre(std::size_t index) const override {
    return position_of(frame_.from_frame(sphere::point(own_->centre(index))), {});
  }
  std::optional<std::size_t> find(GeoPoint point) const override {
    return own_->find(position_of(frame_.to_frame(sphere::point(point)), {}));
  }
  const LatLonEdges* latlon() const override { return own_->latlon(); }
  const Rotation* rotation() const override { return &rotation_; }
  bool on_rim(std::size_t index) const override { return own_->on_rim(index); }
  std::optional<Vec3> x_direction(std::size_t index) const override {
    return frame_.from_frame(*own_->x_direction(index));
  }
  Earth earth() const override { return own_->earth(); }
  codec::Digest digest() const override {
    codec::Hasher hasher;
    hasher.add(std::string("rotated")).add(own_->digest().hex());
    return hasher.add(rotation_.pole_lon_deg)
        .add(rotation_.pole_lat_deg)
        .add(rotation_.north_pole_grid_lon_deg)
        .finish();
  }
  std::string describe() const override {
    return fmt::format("rotated (pole at {:.6g} degrees east, {:.6g} degrees north) {}", rotation_.pole_lon_deg,
                       rotation_.pole_lat_deg, own_->describe());
  }

 private:
  MeshPtr own_;  // the same cells with the frame taken for the geographic one
  Rotation rotation_;
  Frame frame_;
};

// Does the frame coincide with the geographic one? At pole latitude 90 only a shift of longitude is left.
bool turns_nothing(const Rotation& r) {
  return r.pole_lat_deg == 90 && std::fmod(r.pole_lon_deg + 180 - r.north_pole_grid_lon_deg, 360) == 0;
}

template <typename Turn>
Projector projector(Turn turned) {
  return [turned](std::vector<double>& x, std::vector<double>& y) {
    for (std::size_t k = 0; k < x.size(); ++k) {
      const GeoPoint place = position_of(turned(sphere::point_degrees(x[k], y[k])), {});
      x[k] = place.longitude.degrees();
      y[k] = place.latitude.degrees();
    }
  };
}

}  // namespace

// North of the frame is the pole given; before the last turn the true north pole stands on the frame's meridian 0 (CF
// 1.13 appendix F: north_pole_grid_longitude is the true pole's longitude in the frame).
Frame::Frame(const Rotation& rotation) {
  const auto [sin_lambda, cos_lambda] = sphere::sincos_degrees(rotation.pole_lon_deg);
  const auto [sin_phi, cos_phi] = sphere::sincos_degrees(rotation.pole_lat_deg);
  const auto [sin_shift, cos_shift] = sphere::sincos_degrees(rotation.north_pole_grid_lon_deg);
  z_ = {cos_phi * cos_lambda, cos_phi * sin_lambda, sin_phi};
  const Vec3 towards_true_pole{-sin_phi * cos_lambda, -sin_phi * sin_lambda, cos_phi};
  const Vec3 left_of_it = {sin_lambda, -cos_lambda, 0};
  x_ = cos_shift * towards_true_pole - sin_shift * left_of_it;
  y_ = sin_shift * towards_true_pole + cos_shift * left_of_it;
}

void Frame::to_frame(sphere::Polygon& polygon) const {
  turn(polygon, [this](const Vec3& v) { return to_frame(v); });
}
void Frame::from_frame(sphere::Polygon& polygon) const {
  turn(polygon, [this](const Vec3& v) { return from_frame(v); });
}

Projector rotated_projector(const Rotation& rotation) {
  return projector([frame = Frame(rotation)](const Vec3& v) { return frame.from_frame(v); });
}
Projector geographic_to_rotated_projector(const Rotation& rotation) {
  return projector([frame = Frame(rotation)](const Vec3& v) { return frame.to_frame(v); });
}

MeshPtr make_rotated(LatLonEdges edges, const Rotation& rotation, const Earth& earth, const std::string& place) {
  if (earth.e2 != 0) throw Error(Failure::defect, place, "cells between rotated parallels need a spherical earth");
  const bool finite = std::isfinite(rotation.pole_lon_deg) && std::isfinite(rotation.north_pole_grid_lon_deg);
  if (!finite || !(std::abs(rotation.pole_lat_deg) <= 90)) {
    throw Error(Failure::data, place,
                fmt::format("the rotated north pole at longitude {}, latitude {} (north pole grid longitude {}) is no "
                            "place on the globe",
                            rotation.pole_lon_deg, rotation.pole_lat_deg, rotation.north_pole_grid_lon_deg));
  }
  MeshPtr own = make_latlon(std::move(edges), earth, place);
  if (turns_nothing(rotation)) return own;
  return std::make_shared<RotatedMesh>(std::move(own), rotation);
}

}  // namespace windrow::mesh
