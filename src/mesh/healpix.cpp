// HEALPix meshes: sides cut where levels meet, shared ones bent once; points find their cell by arithmetic.
// Areas are equal within 1e-10 to level 17 and 1e-9 to level 20; beyond, the rounding of unit vectors shows (3e-7 at
// 29).
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

#include "edged_mesh.h"
#include "healpix_plane.h"
#include "line_arcs.h"
#include "windrow/base/error.h"

namespace windrow::mesh {
namespace {

using healpix::FaceCell;
using healpix::Place;
using healpix::Side;
using sphere::Vec3;

constexpr double kSideTolerance = 1e-6;  // of a cell: area between a side and its arcs, whose sum keeps the side's own
constexpr double kOnEdge = 2e-14;        // rad: degrees that became radians are off by less
constexpr std::size_t kBlock = 1 << 16;  // sides bent at a time

// Place on the curve through all cells of all levels: a cell reaches from this less 4^(29 - level) to this plus it.
std::uint64_t curve_place(const HealpixCell& cell) {
  return (2 * cell.nested + 1) << (2 * (healpix::kMostLevel - cell.level));
}
std::uint64_t half_reach(std::uint64_t curve_place) { return curve_place & (~curve_place + 1); }

// Middles of the four sides, anticlockwise: south-east and north-east, which run up, north-west and south-west, which
// run down.
std::array<std::uint64_t, 4> sides_of(const HealpixCell& cell) {
  const FaceCell at = healpix::face_cell(cell);
  const std::int64_t size = healpix::kBase >> cell.level, half = size / 2;
  const std::int64_t x = at.x * size, y = at.y * size;
  return {key_of(healpix::place_of(at.face, x + half, y)), key_of(healpix::place_of(at.face, x + size, y + half)),
          key_of(healpix::place_of(at.face, x + half, y + size)), key_of(healpix::place_of(at.face, x, y + half))};
}

void sort_unique(std::vector<std::uint64_t>& keys) {
  std::sort(keys.begin(), keys.end());
  keys.erase(std::unique(keys.begin(), keys.end()), keys.end());
}

std::uint32_t position(const std::vector<std::uint64_t>& sorted, std::uint64_t key) {
  return static_cast<std::uint32_t>(std::lower_bound(sorted.begin(), sorted.end(), key) - sorted.begin());
}

class Builder {
 public:
  Builder(const std::vector<HealpixCell>& cells, const healpix::Latitudes& latitudes)
      : cells_(cells), latitudes_(latitudes) {
    const auto [low, high] = std::minmax_element(cells.begin(), cells.end(), by_level);
    coarsest_ = low->level;
    if (high->level > coarsest_) find_cut_sides();
  }
  EdgedCells build();

 private:
  static bool by_level(const HealpixCell& a, const HealpixCell& b) { return a.level < b.level; }
  void find_cut_sides();
  void add_coarser_sides(const HealpixCell& cell);
  void add_side(std::uint64_t middle, bool up);
  void bend(const std::vector<std::uint64_t>& middles);
  [[nodiscard]] std::vector<Vec3> place(const std::vector<OpenLine>& lines, std::size_t inner,
                                        const std::vector<std::uint64_t>& middles) const;

  const std::vector<HealpixCell>& cells_;
  const healpix::Latitudes& latitudes_;
  int coarsest_ = 0;
  std::vector<std::uint64_t> cut_;       // middles of sides that consist of finer ones
  std::vector<std::uint64_t> use_;       // middles of the sides that cells use, loop by loop
  std::vector<bool> against_;            // one a use: from its upper end to its lower
  std::vector<std::uint64_t> node_key_;  // ascending
  EdgedCells out_;
};

// A side at level L is half of a coarser one where the line it lies on is a line of level L - 1 too.
void Builder::add_coarser_sides(const HealpixCell& cell) {
  const FaceCell at = healpix::face_cell(cell);
  for (const bool north_east : {true, false}) {
    for (const int beyond : {0, 1}) {
      std::int64_t along = north_east ? at.x : at.y;
      std::int64_t line = (north_east ? at.y : at.x) + beyond;
      for (int level = cell.level; level > coarsest_ && line % 2 == 0; --level) {
        along /= 2;
        line /= 2;
        const std::int64_t size = healpix::kBase >> (level - 1);
        const std::int64_t a = along * size + size / 2, b = line * size;
        cut_.push_back(key_of(north_east ? healpix::place_of(at.face, a, b) : healpix::place_of(at.face, b, a)));
      }
    }
  }
}

void Builder::find_cut_sides() {
  for (const HealpixCell& cell : cells_) add_coarser_sides(cell);
  sort_unique(cut_);
}

void Builder::add_side(std::uint64_t middle, bool up) {
  if (!std::binary_search(cut_.begin(), cut_.end(), middle)) {
    use_.push_back(middle);
    against_.push_back(!up);
    return;
  }
  const std::uint64_t low = key_of(healpix::side_of_middle(healpix::place_of_key(middle)).half_middle(-1));
  const std::uint64_t high = key_of(healpix::side_of_middle(healpix::place_of_key(middle)).half_middle(1));
  add_side(up ? low : high, up);
  add_side(up ? high : low, up);
}

EdgedCells Builder::build() {
  for (const HealpixCell& cell : cells_) {
    const std::array<std::uint64_t, 4> sides = sides_of(cell);
    for (std::size_t k = 0; k < 4; ++k) add_side(sides[k], k < 2);
    out_.loop_start.push_back(use_.size());
  }
  cut_ = {};
  std::vector<std::uint64_t> middles = use_;
  sort_unique(middles);
  node_key_.reserve(2 * middles.size());
  for (const std::uint64_t middle : middles) {
    const Side side = healpix::side_of_middle(healpix::place_of_key(middle));
    node_key_.push_back(key_of(side.lower()));
    node_key_.push_back(key_of(side.upper()));
  }
  sort_unique(node_key_);
  out_.node.resize(node_key_.size());
#pragma omp parallel for schedule(static)
  for (std::size_t k = 0; k < node_key_.size(); ++k) {
    out_.node[k] = on_globe(healpix::place_of_key(node_key_[k]), latitudes_);
  }
  bend(middles);
  out_.use.resize(use_.size());
#pragma omp parallel for schedule(static)
  for (std::size_t k = 0; k < use_.size(); ++k) {
    out_.use[k] = position(middles, use_[k]) * 2 + (against_[k] ? 1 : 0);
  }
  return std::move(out_);
}

std::vector<Vec3> Builder::place(const std::vector<OpenLine>& lines, std::size_t inner,
                                 const std::vector<std::uint64_t>& middles) const {
  std::vector<Vec3> points;
  points.reserve(lines.size() * inner);
  for (const OpenLine& line : lines) {
    const Side side = healpix::side_of_middle(healpix::place_of_key(middles[line.number]));
    for (std::size_t k = 1; k <= inner; ++k) {
      points.push_back(on_globe(side, static_cast<double>(k) / static_cast<double>(inner + 1), latitudes_));
    }
  }
  return points;
}

// Edges in the order of `middles`, from the lower end to the upper.
void Builder::bend(const std::vector<std::uint64_t>& middles) {
  out_.edge.reserve(middles.size());
  for (std::size_t first = 0; first < middles.size(); first += kBlock) {
    const std::size_t count = std::min(kBlock, middles.size() - first);
    std::vector<std::uint32_t> lower(count), upper(count);
    std::vector<std::vector<Vec3>> bent(count);  // empty: along a meridian
    std::vector<std::uint8_t> straight(count);
#pragma omp parallel for schedule(static)
    for (std::size_t k = 0; k < count; ++k) {
      const Side side = healpix::side_of_middle(healpix::place_of_key(middles[first + k]));
      lower[k] = position(node_key_, key_of(side.lower()));
      upper[k] = position(node_key_, key_of(side.upper()));
      straight[k] = side.on_gap() ? 1 : 0;
    }
    std::vector<OpenLine> lines;
    for (std::size_t k = 0; k < count; ++k) {
      if (straight[k]) continue;
      const int level = healpix::side_of_middle(healpix::place_of_key(middles[first + k])).level();
      lines.push_back({first + k, out_.node[lower[k]], out_.node[upper[k]], healpix::cell_area(level)});
    }
    const std::vector<OpenLine> rough = split_lines(
        lines, [&](const std::vector<OpenLine>& open, std::size_t inner) { return place(open, inner, middles); },
        [&](std::uint64_t number, std::vector<Vec3> inner) { bent[number - first] = std::move(inner); },
        {kSideTolerance, true});
    if (!rough.empty()) throw Error(Failure::defect, "HEALPix", "the side of a cell is no smooth line");
    for (std::size_t k = 0; k < count; ++k) {
      if (bent[k].empty()) {
        out_.add_edge(lower[k], upper[k]);
      } else {
        out_.add_bent(lower[k], upper[k], bent[k]);
      }
    }
  }
}

class HealpixMesh final : public EdgedMesh {
 public:
  HealpixMesh(EdgedCells edged, EdgedTraits traits, const std::vector<HealpixCell>& cells,
              std::vector<std::uint32_t> along_curve, double e2_of_file, const std::string& place)
      : EdgedMesh(std::move(edged), std::move(traits), place),
        along_curve_(std::move(along_curve)),
        e2_of_file_(e2_of_file) {
    curve_place_.reserve(cells.size());
    for (const HealpixCell& cell : cells) curve_place_.push_back(curve_place(cell));
  }

  GeoPoint centre(std::size_t index) const override {
    return healpix::centre(healpix_from_zuniq(curve_place_[index], "HEALPix"), e2_of_file_);
  }
  /// By the equations and a search along the curve.
  std::optional<std::size_t> find(GeoPoint point) const override;

 private:
  [[nodiscard]] std::optional<std::size_t> holder(const HealpixCell& finest) const;

  std::vector<std::uint64_t> curve_place_;  // one a cell
  std::vector<std::uint32_t> along_curve_;  // cells by ascending curve_place_
  double e2_of_file_;
};

// Cells do not overlap: of those whose middle is nearest before and after a place of the curve one may reach it.
std::optional<std::size_t> HealpixMesh::holder(const HealpixCell& finest) const {
  const std::uint64_t at = curve_place(finest);
  const auto after = std::upper_bound(along_curve_.begin(), along_curve_.end(), at,
                                      [&](std::uint64_t a, std::uint32_t cell) { return a < curve_place_[cell]; });
  if (after != along_curve_.end() && curve_place_[*after] - at < half_reach(curve_place_[*after])) return *after;
  if (after == along_curve_.begin()) return {};
  const std::uint32_t before = *(after - 1);
  if (at - curve_place_[before] < half_reach(curve_place_[before])) return before;
  return {};
}

std::optional<std::size_t> HealpixMesh::find(GeoPoint point) const {
  const double phi = authalic_latitude_deg(point.latitude.degrees(), e2_of_file_);
  const double lambda = point.longitude.degrees();
  // z = sin(phi) = 2/3 up on the belt; around the poles 1 - |z| = 2 sin²(colatitude / 2) = (2 - |up|)² / 3.
  double up = 1.5 * std::sin(Angle::degrees(phi).radians());
  double from_pole = 2 - std::abs(up);
  if (std::abs(up) > 1) {
    from_pole = std::sqrt(6.0) * std::sin(0.5 * Angle::degrees(90 - std::abs(phi)).radians());
    up = std::copysign(2 - from_pole, phi);
  }
  std::optional<std::size_t> lowest;
  std::optional<HealpixCell> last;
  const auto look = [&](double longitude, double u, double f) {
    const HealpixCell finest = healpix::finest_at(longitude, u, f);
    if (finest == last) return;
    last = finest;
    const std::optional<std::size_t> cell = holder(finest);
    if (cell && (!lowest || *cell < *lowest)) lowest = cell;
  };
  if (from_pole < 2 * kOnEdge) {
    for (const double longitude : {45, 135, 225, 315}) look(longitude, up, from_pole);
    return lowest;
  }
  // A point on an edge is in the cells on both sides of it. Sides run aslant: around an inner corner cells lie north,
  // east, south and west, at a gap of the plane in the four directions between.
  const double aside = 45 * kOnEdge / std::min(1.0, from_pole);
  for (const double north : {-kOnEdge, 0.0, kOnEdge}) {
    for (const double east : {-aside, 0.0, aside}) {
      look(lambda + east, up + north, from_pole - std::copysign(north, north * up));
    }
  }
  return lowest;
}

std::string name_of(const HealpixCell& cell) { return fmt::format("cell {} of level {}", cell.nested, cell.level); }

// The cells' order along the curve. Error(data) for cells that do not exist or lie over each other.
std::vector<std::uint32_t> order_along_curve(const std::vector<HealpixCell>& cells, const std::string& place) {
  if (cells.empty()) throw Error(Failure::data, place, "no HEALPix cells, expected at least one");
  for (const HealpixCell& cell : cells) {
    if (cell.level < 0 || cell.level > healpix::kMostLevel) {
      throw Error(Failure::data, place,
                  fmt::format("HEALPix level {}, expected 0 to {}", cell.level, healpix::kMostLevel));
    }
    if (cell.nested >= healpix::cells_of_level(cell.level)) {
      throw Error(Failure::data, place,
                  fmt::format("HEALPix cell {} of level {}, expected 0 to {}", cell.nested, cell.level,
                              healpix::cells_of_level(cell.level) - 1));
    }
  }
  std::vector<std::uint32_t> order(cells.size());
  std::iota(order.begin(), order.end(), 0U);
  const auto before = [&](std::uint32_t a, std::uint32_t b) { return curve_place(cells[a]) < curve_place(cells[b]); };
  if (!std::is_sorted(order.begin(), order.end(), before)) std::sort(order.begin(), order.end(), before);
  for (std::size_t k = 0; k + 1 < order.size(); ++k) {
    const HealpixCell &a = cells[order[k]], &b = cells[order[k + 1]];
    const std::uint64_t here = curve_place(a), next = curve_place(b);
    if (next - here >= half_reach(here) + half_reach(next)) continue;
    throw Error(Failure::data, place,
                a == b ? fmt::format("HEALPix {} is given twice", name_of(a))
                       : fmt::format("HEALPix {} and {} lie over each other", name_of(a), name_of(b)));
  }
  return order;
}

std::string describe(const std::vector<HealpixCell>& cells) {
  const auto [low, high] =
      std::minmax_element(cells.begin(), cells.end(), [](const auto& a, const auto& b) { return a.level < b.level; });
  if (low->level < high->level) {
    return fmt::format("HEALPix, levels {} to {}, {} cells", low->level, high->level, cells.size());
  }
  const bool global = cells.size() == healpix::cells_of_level(low->level);
  return fmt::format("HEALPix, level {}, {} cells{}", low->level, cells.size(), global ? ", global" : "");
}

}  // namespace

MeshPtr make_healpix(const std::vector<HealpixCell>& cells, double e2_of_file, const Earth& earth,
                     const std::string& place) {
  std::vector<std::uint32_t> order = order_along_curve(cells, place);
  const healpix::Latitudes latitudes{e2_of_file, earth};
  EdgedTraits traits;
  traits.earth = earth;
  traits.kind = fmt::format("healpix {}", e2_of_file);
  traits.description = describe(cells);
  return std::make_shared<HealpixMesh>(Builder(cells, latitudes).build(), std::move(traits), cells, std::move(order),
                                       e2_of_file, place);
}

}  // namespace windrow::mesh
