// Cells stored by the edges they share: what lists of corners, faces, HEALPix cells and polygons all become. Whoever
// fills EdgedCells decides where edges run; here they are kept, measured and searched.
#pragma once
#include <cstdint>
#include <functional>
#include <memory>
#include <mutex>
#include <span>
#include <string>
#include <vector>

#include "windrow/mesh/index.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {

/// Nodes, edges between them, and cells as chains of edges. An edge has one canonical direction in which its arcs are
/// made, always the same way; who uses it the other way gets them reversed, so that neighbours share bits.
struct EdgedCells {
  enum class Run : std::uint8_t { tilted, parallel, split };
  struct Edge {
    std::uint32_t from = 0, to = 0;
    double tilt = 0;          ///< of a tilted edge, see sphere::tilt_through; 0: great circle
    std::uint32_t inner = 0;  ///< of a split edge: its first point in `inner`
    std::uint16_t parts = 1;  ///< of a split edge, one arc each: 2 * parts - 1 inner points, middles and ends in turn
    Run run = Run::tilted;
  };
  /// Edge number * 2, and 1 more when the cell runs through it against its canonical direction.
  using Use = std::uint32_t;

  std::vector<sphere::Vec3> node;  ///< unit vectors on the sphere of areas (authalic)
  std::vector<Edge> edge;
  std::vector<sphere::Vec3> inner;  ///< points of split edges
  std::vector<double> inner_tilt;   ///< of the arc through each inner point that is a middle; 0 for those between arcs
  std::vector<Use> use;             ///< loops one after another, each anticlockwise about its cell (holes clockwise)
  std::vector<std::uint64_t> loop_start{0};  ///< loops + 1, places in `use`
  std::vector<std::uint64_t> piece_start;    ///< pieces + 1, numbers of loops (outer one first); empty: one loop each
  std::vector<std::uint64_t> cell_start;     ///< cells + 1, numbers of pieces; empty: one piece each
  std::vector<double> centre_lon_deg,
      centre_lat_deg;  ///< one a cell, or empty: mean direction of the nodes of its loops

  /// Each returns the edge's number. Arcs are at most 90 degrees long; `from` and `to` differ by more than
  /// sphere::kOnCircle.
  std::uint32_t add_edge(std::uint32_t from, std::uint32_t to, double tilt = 0);  ///< great circle, or bent
  /// Along the parallel through both nodes (of one z), the short way round; any length below 180 degrees.
  std::uint32_t add_parallel(std::uint32_t from, std::uint32_t to);
  /// One arc through `points[0]`, or parts() of them: an odd number of points, the middles of arcs and what lies
  /// between.
  std::uint32_t add_bent(std::uint32_t from, std::uint32_t to, std::span<const sphere::Vec3> points);
  void close_loop() { loop_start.push_back(use.size()); }
  /// The edge's arcs, appended, in canonical direction or reversed.
  void arcs(Use use_of_edge, sphere::Loop& out) const;
  [[nodiscard]] std::uint32_t start_node(Use u) const { return u & 1U ? edge[u / 2].to : edge[u / 2].from; }

  [[nodiscard]] std::size_t loops() const { return loop_start.size() - 1; }
  [[nodiscard]] std::size_t pieces() const { return piece_start.empty() ? loops() : piece_start.size() - 1; }
  [[nodiscard]] std::size_t cells() const { return cell_start.empty() ? pieces() : cell_start.size() - 1; }
  [[nodiscard]] std::span<const Use> loop(std::size_t number) const {
    return {use.data() + loop_start[number], use.data() + loop_start[number + 1]};
  }
};

/// What an EdgedMesh says about itself.
struct EdgedTraits {
  std::size_t ny = 1, nx = 0;  ///< of a structured mesh; nx 0: (1, cells)
  Earth earth;
  std::string kind;                              ///< goes into the digest
  std::string description;                       ///< describe()
  bool overlapping = false;                      ///< cells may lie over each other: all are on the rim
  std::function<std::string(std::size_t)> name;  ///< of a cell, for errors; empty: "cell 7"
};

/// Open to deriving: a kind of mesh that finds points by arithmetic overrides find().
class EdgedMesh : public Mesh {
 public:
  /// Measures all cells (on all threads). Error(data) naming the first cell without area (a clockwise one too).
  EdgedMesh(EdgedCells cells, EdgedTraits traits, const std::string& place);

  std::size_t size() const override { return area_.size(); }
  std::pair<std::size_t, std::size_t> shape() const override;
  sphere::Polygon cell(std::size_t index) const override;
  void cell_into(std::size_t index, sphere::Polygon& out) const override;
  /// Of cells with three or four edges, none of them split.
  std::optional<Hull> hull(std::size_t index) const override;
  double area(std::size_t index) const override { return area_[index]; }
  double perimeter(std::size_t index) const override { return perimeter_[index]; }
  GeoPoint centre(std::size_t index) const override;
  /// By search; the index is built when first asked.
  std::optional<std::size_t> find(GeoPoint point) const override;
  bool on_rim(std::size_t index) const override { return rim_[index]; }
  bool cells_may_overlap() const override { return traits_.overlapping; }
  /// Of structured meshes: from the middle of the left side to that of the right one, sides being what the cell shares
  /// with its neighbours along x.
  std::optional<sphere::Vec3> x_direction(std::size_t index) const override;
  Earth earth() const override { return traits_.earth; }
  codec::Digest digest() const override { return digest_; }
  std::string describe() const override { return traits_.description; }

 protected:
  [[nodiscard]] const EdgedCells& cells() const { return cells_; }

 private:
  [[nodiscard]] std::pair<std::size_t, std::size_t> pieces_of(std::size_t cell) const;
  [[nodiscard]] std::pair<std::size_t, std::size_t> loops_of_piece(std::size_t piece) const;
  [[nodiscard]] std::span<const EdgedCells::Use> uses_of(std::size_t cell) const;
  [[nodiscard]] sphere::Vec3 middle_of(EdgedCells::Use use) const;
  void measure(const std::string& place);
  void find_rim();
  void make_digest();

  EdgedCells cells_;
  EdgedTraits traits_;
  std::vector<double> area_, perimeter_;
  std::vector<bool> rim_;
  codec::Digest digest_;
  mutable std::once_flag index_once_;
  mutable std::unique_ptr<const Index> index_;
};

}  // namespace windrow::mesh
