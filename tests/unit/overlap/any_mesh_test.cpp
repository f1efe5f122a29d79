// Cell against cell: the way of meshes that have no closed form, checked where there is one.
#include <doctest/doctest.h>

#include <cmath>
#include <random>

#include "windrow/overlap/overlap.h"

namespace windrow::overlap {
namespace {

using linear_map::Quantity;

// A mesh whose latitude-longitude structure is hidden: every overlap must be clipped.
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

mesh::MeshPtr global(std::size_t nx, std::size_t ny, double west) {
  mesh::LatLonEdges edges;
  for (std::size_t i = 0; i <= nx; ++i)
    edges.lon_deg.push_back(west + 360.0 * static_cast<double>(i) / static_cast<double>(nx));
  for (std::size_t j = 0; j <= ny; ++j)
    edges.lat_deg.push_back(-90 + 180.0 * static_cast<double>(j) / static_cast<double>(ny));
  return mesh::make_latlon(edges, {}, "test");
}

double share_of(const linear_map::LinearMap& map, std::size_t row, std::uint32_t column) {
  for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
    if (map.column[k] == column) return map.share[k];
  }
  return 0;
}

void same_shares(const linear_map::LinearMap& a, const linear_map::LinearMap& b, const mesh::Mesh& target) {
  REQUIRE(a.rows() == b.rows());
  double worst = 0;
  for (std::size_t row = 0; row < a.rows(); ++row) {
    const double bound = 1e-12 + 8 * 2.3e-16 * target.perimeter(row) / target.area(row);
    const auto compare = [&](const linear_map::LinearMap& one, const linear_map::LinearMap& other) {
      for (auto k = one.row_start[row]; k < one.row_start[row + 1]; ++k) {
        worst = std::max(worst, std::abs(one.share[k] - share_of(other, row, one.column[k])) / bound);
      }
    };
    compare(a, b);
    compare(b, a);
  }
  CHECK(worst <= 1);
}

}  // namespace

TEST_CASE("cell against cell gives the closed form's shares, poles and date line included") {
  for (const auto& [sx, sy, tx, ty, shift] :
       {std::tuple(24, 12, 37, 19, 3.3), std::tuple(8, 4, 50, 31, 170.0), std::tuple(60, 30, 7, 5, -11.0),
        std::tuple(36, 18, 36, 18, 0.0), std::tuple(5, 2, 72, 36, 0.0)}) {
    const auto source = global(sx, sy, 0);
    const auto target = global(tx, ty, shift);
    const auto exact = conservative(*source, *target, Quantity::mean);
    const Plain plain_source(source), plain_target(target);
    const auto clipped = conservative(plain_source, plain_target, Quantity::mean);
    same_shares(exact.map, clipped.map, *target);
    CHECK(clipped.closure.holds);
    CHECK(clipped.closure.rows_checked == target->size());
    CHECK(clipped.closure.columns_checked == source->size());
    // The block on the target's side: rows are turned into columns.
    same_shares(exact.map, conservative(plain_source, *target, Quantity::mean).map, *target);
    same_shares(exact.map, conservative(*source, plain_target, Quantity::mean).map, *target);
  }
}

TEST_CASE("first moments of the parts of a source cell add up to nothing about its centroid") {
  const auto source = global(24, 12, 0);
  const auto target = global(37, 19, 3.3);
  const auto map = conservative_linear(*source, *target, Quantity::mean).map;
  CHECK(map.columns == 3 * source->size());
  const auto sums = linear_map::column_overlap(map);
  double worst = 0;
  for (std::size_t c = source->size(); c < map.columns; ++c) worst = std::max(worst, std::abs(sums[c]));
  const double size = source->area(source->size() / 2);
  MESSAGE("largest moment left " << worst << " of cells of " << size << " sr");
  CHECK(worst < 1e-13 * std::pow(size, 1.5));
}

}  // namespace windrow::overlap
