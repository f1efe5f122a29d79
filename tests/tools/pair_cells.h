// Random pairs of cells for the checks against oracles: ordinary ones, and degenerate ones on purpose. No overlaps
// here.
#pragma once
#include <cstdint>
#include <random>
#include <string>

#include "windrow/mesh/mesh.h"

namespace windrow::test {

/// Two meshes of one cell each, and how they came to lie as they do.
struct CellPair {
  mesh::MeshPtr a, b;
  std::string relation;
};

/// Two latitude-longitude cells by their edges (degrees).
struct LatLonPair {
  mesh::LatLonEdges a, b;
  std::string relation;
};

class PairMaker {
 public:
  explicit PairMaker(std::uint64_t seed) : random_(seed) {}
  /// Triangles to octagons, some concave, sides along great circles.
  CellPair great_circles();
  LatLonPair latlon();
  /// Any kinds of cells of which at least one has sides along other circles.
  CellPair mixed();
  mesh::Rotation rotation();
  /// How many cells could not be made: corners moved until sides cross.
  [[nodiscard]] std::size_t refused() const { return refused_; }

 private:
  // A place to put cells, and the plane that touches the globe there.
  struct Place {
    sphere::Vec3 up, right, forward;
  };
  struct Spot {
    double x, y;
  };
  using Outline = std::vector<Spot>;

  double uniform(double low, double high) { return std::uniform_real_distribution<double>(low, high)(random_); }
  double log_uniform(double low, double high);
  std::size_t below(std::size_t n) { return std::uniform_int_distribution<std::size_t>(0, n - 1)(random_); }
  bool chance(double p) { return uniform(0, 1) < p; }
  Place place();
  static Place at(const sphere::Vec3& up);
  Outline outline();
  CellPair try_great_circles();
  mesh::MeshPtr great(const Place& place, const Outline& outline, double size);
  std::vector<double> interval(double low, double high, std::string& relation);
  mesh::MeshPtr any(const Place& place, double size, std::string& kind);
  mesh::MeshPtr boxed(const Place& place, double size, const mesh::Rotation* rotation);
  mesh::MeshPtr healpix(double size);
  mesh::MeshPtr polygon(const Place& place, double size);
  mesh::MeshPtr related_box(const mesh::Mesh& a, std::string& relation);

  std::mt19937_64 random_;
  std::size_t refused_ = 0;
};

/// A mesh whose latitude-longitude structure is hidden: every overlap must be clipped.
class Plain final : public mesh::Mesh {
 public:
  explicit Plain(mesh::MeshPtr mesh) : mesh_(std::move(mesh)) {}
  std::size_t size() const override { return mesh_->size(); }
  std::pair<std::size_t, std::size_t> shape() const override { return mesh_->shape(); }
  sphere::Polygon cell(std::size_t index) const override { return mesh_->cell(index); }
  double area(std::size_t index) const override { return mesh_->area(index); }
  double perimeter(std::size_t index) const override { return mesh_->perimeter(index); }
  GeoPoint centre(std::size_t index) const override { return mesh_->centre(index); }
  std::optional<std::size_t> find(GeoPoint point) const override { return mesh_->find(point); }
  bool on_rim(std::size_t index) const override { return mesh_->on_rim(index); }
  codec::Digest digest() const override { return mesh_->digest(); }
  std::string describe() const override { return mesh_->describe(); }

 private:
  mesh::MeshPtr mesh_;
};

}  // namespace windrow::test
