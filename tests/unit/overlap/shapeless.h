// Meshes without rows and columns, made of latitude-longitude blocks: what structured grids look like to geometry
// alone.
#pragma once
#include <tuple>
#include <vector>

#include "../mesh/azimuthal.h"
#include "windrow/mesh/mesh.h"

namespace windrow::test {

/// The cells of some meshes one after another, all structure forgotten.
class Shapeless final : public mesh::Mesh {
 public:
  explicit Shapeless(std::vector<mesh::MeshPtr> blocks) : blocks_(std::move(blocks)) {
    for (std::size_t b = 0; b < blocks_.size(); ++b) {
      first_.push_back(block_.size());
      block_.insert(block_.end(), blocks_[b]->size(), b);
    }
  }
  std::size_t size() const override { return block_.size(); }
  std::pair<std::size_t, std::size_t> shape() const override { return {1, size()}; }
  sphere::Polygon cell(std::size_t k) const override { return of(k).cell(k - first_[block_[k]]); }
  double area(std::size_t k) const override { return of(k).area(k - first_[block_[k]]); }
  double perimeter(std::size_t k) const override { return of(k).perimeter(k - first_[block_[k]]); }
  GeoPoint centre(std::size_t k) const override { return of(k).centre(k - first_[block_[k]]); }
  std::optional<std::size_t> find(GeoPoint point) const override {
    for (std::size_t b = 0; b < blocks_.size(); ++b) {
      if (const std::optional<std::size_t> found = blocks_[b]->find(point)) return first_[b] + *found;
    }
    return {};
  }
  bool on_rim(std::size_t) const override { return true; }
  mesh::Earth earth() const override { return blocks_.front()->earth(); }
  codec::Digest digest() const override { return blocks_.front()->digest(); }
  std::string describe() const override { return "cells without shape"; }

 private:
  const mesh::Mesh& of(std::size_t k) const { return *blocks_[block_[k]]; }
  std::vector<mesh::MeshPtr> blocks_;
  std::vector<std::size_t> block_, first_;
};

/// Rows of equal height from pole to pole with so many cells each: a reduced grid, whose corners hang on others' sides.
inline mesh::MeshPtr reduced(const std::vector<std::size_t>& cells_a_row) {
  std::vector<mesh::MeshPtr> rows;
  const double height = 180.0 / static_cast<double>(cells_a_row.size());
  for (std::size_t j = 0; j < cells_a_row.size(); ++j) {
    const double south = -90 + height * static_cast<double>(j);
    const double north = j + 1 == cells_a_row.size() ? 90 : -90 + height * static_cast<double>(j + 1);
    rows.push_back(
        mesh::make_latlon({even_edges(0, 360.0 / static_cast<double>(cells_a_row[j]), cells_a_row[j]), {south, north}},
                          mesh::Earth::sphere(kRadius_m), "row"));
  }
  return std::make_shared<Shapeless>(std::move(rows));
}

/// A latitude-longitude grid as a curvilinear one: rows and columns, corners, but no coordinates of its own.
inline mesh::MeshPtr curvilinear(const mesh::Mesh& grid) {
  const mesh::LatLonEdges& edges = *grid.latlon();
  mesh::CellCorners corners;
  corners.most = 4;
  std::tie(corners.ny, corners.nx) = grid.shape();
  for (std::size_t k = 0; k < grid.size(); ++k) {
    const std::size_t j = k / corners.nx, i = k % corners.nx;
    corners.lon_deg.insert(corners.lon_deg.end(),
                           {edges.lon_deg[i], edges.lon_deg[i + 1], edges.lon_deg[i + 1], edges.lon_deg[i]});
    corners.lat_deg.insert(corners.lat_deg.end(),
                           {edges.lat_deg[j], edges.lat_deg[j], edges.lat_deg[j + 1], edges.lat_deg[j + 1]});
    corners.centre_lon_deg.push_back(grid.centre(k).longitude.degrees());
    corners.centre_lat_deg.push_back(grid.centre(k).latitude.degrees());
  }
  Notices notices;
  return mesh::make_cells(std::move(corners), mesh::Sides::parallels, grid.earth(), "curvilinear", notices);
}

}  // namespace windrow::test
