// Some cells of another mesh: gathered grids, whose files leave out the sea or the land.
#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <unordered_map>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

// The ends of an arc in either order: neighbours share them to the bit.
struct Side {
  Vec3 low, high;
  bool operator==(const Side&) const = default;
};

Side side_of(const sphere::Arc& arc) {
  const auto precedes = [](const Vec3& a, const Vec3& b) {
    if (a.x != b.x) return a.x < b.x;
    return a.y != b.y ? a.y < b.y : a.z < b.z;
  };
  return precedes(arc.from, arc.to) ? Side{arc.from, arc.to} : Side{arc.to, arc.from};
}

struct SideHash {
  std::size_t operator()(const Side& s) const {
    std::uint64_t h = 0;
    for (const double v : {s.low.x, s.low.y, s.low.z, s.high.x, s.high.y, s.high.z}) {
      h = (h ^ std::bit_cast<std::uint64_t>(v + 0.0)) * 0x9e3779b97f4a7c15ULL;  // -0 and 0 are equal
      h ^= h >> 31;
    }
    return h;
  }
};

class SubsetMesh final : public Mesh {
 public:
  SubsetMesh(MeshPtr full, std::vector<std::uint32_t> cells) : full_(std::move(full)), cells_(std::move(cells)) {
    for (std::size_t k = 0; k < cells_.size(); ++k) number_.emplace(cells_[k], k);
    find_rim();
  }

  std::size_t size() const override { return cells_.size(); }
  std::pair<std::size_t, std::size_t> shape() const override { return {1, cells_.size()}; }
  sphere::Polygon cell(std::size_t index) const override { return full_->cell(cells_[index]); }
  void cell_into(std::size_t index, sphere::Polygon& out) const override { full_->cell_into(cells_[index], out); }
  std::optional<Hull> hull(std::size_t index) const override { return full_->hull(cells_[index]); }
  double area(std::size_t index) const override { return full_->area(cells_[index]); }
  double perimeter(std::size_t index) const override { return full_->perimeter(cells_[index]); }
  GeoPoint centre(std::size_t index) const override { return full_->centre(cells_[index]); }
  std::optional<std::size_t> find(GeoPoint point) const override {
    const std::optional<std::size_t> found = full_->find(point);
    if (!found) return {};
    const auto here = number_.find(static_cast<std::uint32_t>(*found));
    if (here == number_.end()) return {};
    return here->second;
  }
  bool on_rim(std::size_t index) const override { return rim_[index]; }
  std::optional<Vec3> x_direction(std::size_t index) const override { return full_->x_direction(cells_[index]); }
  bool cells_may_overlap() const override { return full_->cells_may_overlap(); }
  bool has_area() const override { return full_->has_area(); }
  Earth earth() const override { return full_->earth(); }
  codec::Digest digest() const override {
    codec::Hasher hasher;
    hasher.add(std::string("subset")).add(full_->digest().hex());
    return hasher.add(std::as_bytes(std::span(cells_))).finish();
  }
  std::string describe() const override { return fmt::format("{} cells of: {}", cells_.size(), full_->describe()); }

 private:
  void find_rim();

  MeshPtr full_;
  std::vector<std::uint32_t> cells_;
  std::unordered_map<std::uint32_t, std::size_t> number_;  // of a cell of the full mesh here; the first of equal ones
  std::vector<bool> rim_;
};

template <typename Visit>
void visit_sides(const sphere::Polygon& polygon, Visit&& visit) {
  for (const sphere::Piece& piece : polygon.pieces) {
    for (const sphere::Loop& loop : piece.loops) {
      for (const sphere::Arc& arc : loop) visit(side_of(arc));
    }
  }
}

// A side that only one of the cells has leads out of the subset.
void SubsetMesh::find_rim() {
  rim_.assign(size(), true);
  if (!full_->has_area()) return;
  std::unordered_map<Side, std::uint32_t, SideHash> used;
  sphere::Polygon polygon;
  for (const auto& [cell, number] : number_) {
    full_->cell_into(cell, polygon);
    visit_sides(polygon, [&](const Side& side) { ++used[side]; });
  }
  for (std::size_t k = 0; k < size(); ++k) {
    bool open = full_->on_rim(cells_[k]);
    full_->cell_into(cells_[k], polygon);
    if (!open) visit_sides(polygon, [&](const Side& side) { open = open || used[side] < 2; });
    rim_[k] = open;
  }
}

}  // namespace

MeshPtr make_subset(MeshPtr full, std::vector<std::uint32_t> cells) {
  const auto beyond = std::find_if(cells.begin(), cells.end(), [&](std::uint32_t c) { return c >= full->size(); });
  if (beyond != cells.end()) {
    throw Error(Failure::data, "gathered cells",
                fmt::format("cell {} is asked for, but the grid has cells 0 to {} only ({})", *beyond,
                            static_cast<std::int64_t>(full->size()) - 1, full->describe()));
  }
  return std::make_shared<SubsetMesh>(std::move(full), std::move(cells));
}

}  // namespace windrow::mesh
