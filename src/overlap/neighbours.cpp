// Which cells touch: by rows and columns where a grid has them, by their polygons everywhere else.
#include <algorithm>
#include <utility>

#include "contacts.h"
#include "windrow/mesh/index.h"
#include "windrow/sphere/area.h"

namespace windrow::overlap {
namespace {

using sphere::Vec3;
using Pair = std::pair<std::uint32_t, std::uint32_t>;

// Cells this near touch, as a part of the smaller one's width: sides drawn as great circles in one cell and along
// parallels in a smaller neighbour leave gaps of a few thousandths. Far less than what separates cells that do not
// touch.
constexpr double kTouching = 0.01;

enum class Contact { none, corner, side };

// Is p within `reach` of the arc? The arc's end is the start of another one.
bool near(const Vec3& p, const sphere::Arc& arc, double reach) {
  const Vec3 off = p - arc.from;
  if (dot(off, off) <= reach * reach) return true;
  const sphere::Circle& c = arc.circle;
  if (std::abs(sphere::height(c, p)) > reach * c.radius) return false;
  const Vec3 middle = c.d * c.n;
  const Vec3 q = p - middle, a = arc.from - middle, b = arc.to - middle;
  const double sense = arc.dtheta > 0 ? 1 : -1;
  return sense * dot(cross(a, q), c.n) >= 0 && sense * dot(cross(q, b), c.n) >= 0 && dot(q, a + b) > 0;
}

// Visits the vertices of `a` that lie on the boundary of `b`; true when `visit` is satisfied.
template <typename Visit>
bool visit_contacts(const sphere::Polygon& a, const sphere::Polygon& b, double reach, Visit&& visit) {
  for (const sphere::Piece& piece_a : a.pieces) {
    for (const sphere::Loop& loop_a : piece_a.loops) {
      for (const sphere::Arc& arc_a : loop_a) {
        bool on = false;
        for (const sphere::Piece& piece_b : b.pieces) {
          for (const sphere::Loop& loop_b : piece_b.loops) {
            for (const sphere::Arc& arc_b : loop_b) on = on || near(arc_a.from, arc_b, reach);
          }
        }
        if (on && visit(arc_a.from)) return true;
      }
    }
  }
  return false;
}

// A side is shared where two contacts stand apart.
Contact contact(const sphere::Polygon& a, const sphere::Polygon& b, double reach) {
  Contact found = Contact::none;
  Vec3 first;
  const auto visit = [&](const Vec3& p) {
    if (found == Contact::none) {
      first = p;
      found = Contact::corner;
    } else if (norm(p - first) > 2 * reach) {
      found = Contact::side;
    }
    return found == Contact::side;
  };
  if (!visit_contacts(a, b, reach, visit)) visit_contacts(b, a, reach, visit);
  return found;
}

double reach_of(const mesh::Mesh& mesh, std::size_t index, const sphere::Polygon& polygon) {
  const double length = sphere::perimeter(polygon);
  return length > 0 ? kTouching * 4 * mesh.area(index) / length : 0;
}

// Pairs of cells of `part` that are in contact, lower number first. Cells are those of `part`.
std::vector<Pair> contacts(const mesh::Mesh& part, Contact least) {
  const mesh::Index index(part);
  constexpr std::size_t kRun = 1024;
  std::vector<std::vector<Pair>> runs((part.size() + kRun - 1) / kRun);
#pragma omp parallel
  {
    sphere::Polygon own, other;
    std::vector<std::uint32_t> candidates;
#pragma omp for schedule(dynamic)
    for (std::size_t run = 0; run < runs.size(); ++run) {
      for (std::size_t k = run * kRun; k < std::min(part.size(), (run + 1) * kRun); ++k) {
        part.cell_into(k, own);
        const double reach = reach_of(part, k, own);
        mesh::Box box = mesh::box_of(own);
        for (std::size_t axis = 0; axis < 3; ++axis) {
          box.low[axis] -= static_cast<float>(reach) + 0x1p-24F;
          box.high[axis] += static_cast<float>(reach) + 0x1p-24F;
        }
        index.find(box, candidates);
        for (const std::uint32_t candidate : candidates) {
          if (candidate <= k) continue;
          part.cell_into(candidate, other);
          const double nearer = std::min(reach, reach_of(part, candidate, other));
          if (contact(own, other, nearer) >= least) runs[run].emplace_back(static_cast<std::uint32_t>(k), candidate);
        }
      }
    }
  }
  std::vector<Pair> pairs;
  for (const std::vector<Pair>& run : runs) pairs.insert(pairs.end(), run.begin(), run.end());
  return pairs;
}

// Rows and columns of a grid whose cells meet corner to corner.
struct Lattice {
  std::size_t ny, nx;
  bool closed;                  // the last column touches the first
  bool south_pole, north_pole;  // all cells of the first, last row meet at the pole

  // Adds the neighbours of a cell, ascending, without itself.
  void add(std::size_t index, bool sides_only, std::vector<std::uint32_t>& out) const {
    const std::size_t j = index / nx, i = index % nx;
    const auto first = static_cast<std::ptrdiff_t>(out.size());
    const std::size_t west = i > 0 ? i - 1 : (closed ? nx - 1 : i);
    const std::size_t east = i + 1 < nx ? i + 1 : (closed ? 0 : i);
    for (std::size_t row = j > 0 ? j - 1 : 0; row <= std::min(ny - 1, j + 1); ++row) {
      const bool at_pole = !sides_only && row == j && ((j == 0 && south_pole) || (j == ny - 1 && north_pole));
      if (at_pole) {
        for (std::size_t k = 0; k < nx; ++k) out.push_back(static_cast<std::uint32_t>(row * nx + k));
        continue;
      }
      for (const std::size_t k : {west, i, east}) {
        if (sides_only && (row == j) == (k == i)) continue;
        out.push_back(static_cast<std::uint32_t>(row * nx + k));
      }
    }
    std::sort(out.begin() + first, out.end());
    out.erase(std::unique(out.begin() + first, out.end()), out.end());
    out.erase(std::remove(out.begin() + first, out.end(), static_cast<std::uint32_t>(index)), out.end());
  }
  [[nodiscard]] bool at_rim(std::size_t index) const {
    const std::size_t j = index / nx, i = index % nx;
    return j == 0 || j == ny - 1 || i == 0 || i == nx - 1;
  }
};

std::vector<Vec3> vertices(const mesh::Mesh& mesh, std::size_t index, sphere::Polygon& polygon) {
  mesh.cell_into(index, polygon);
  std::vector<Vec3> out;
  for (const sphere::Piece& piece : polygon.pieces) {
    for (const sphere::Loop& loop : piece.loops) {
      for (const sphere::Arc& arc : loop) out.push_back(arc.from);
    }
  }
  return out;
}

bool share_two(const std::vector<Vec3>& a, const std::vector<Vec3>& b) {
  return std::count_if(a.begin(), a.end(),
                       [&](const Vec3& p) { return std::find(b.begin(), b.end(), p) != b.end(); }) >= 2;
}

// Does every cell share two vertices, to the bit, with the next in its row and in its column?
bool meets_corner_to_corner(const mesh::Mesh& mesh, std::size_t ny, std::size_t nx) {
  bool all = true;
#pragma omp parallel for schedule(static) reduction(&& : all)
  for (std::size_t j = 0; j < ny; ++j) {
    sphere::Polygon polygon;
    std::vector<std::vector<Vec3>> row, above;
    for (std::size_t i = 0; i < nx && all; ++i) {
      row.push_back(vertices(mesh, j * nx + i, polygon));
      if (i > 0) all = all && share_two(row[i - 1], row[i]);
      if (j + 1 < ny) all = all && share_two(row[i], vertices(mesh, (j + 1) * nx + i, polygon));
    }
  }
  return all;
}

std::optional<Lattice> lattice_of(const mesh::Mesh& mesh) {
  const auto [ny, nx] = mesh.shape();
  if (const mesh::LatLonEdges* edges = mesh.latlon()) {
    return Lattice{ny, nx, mesh::all_round(*edges), edges->lat_deg.front() == -90, edges->lat_deg.back() == 90};
  }
  if (ny < 2 || nx < 2 || !meets_corner_to_corner(mesh, ny, nx)) return {};
  return Lattice{ny, nx, false, false, false};
}

// Contacts between the outermost cells of a lattice that rows and columns do not tell: seams, folds, poles.
std::vector<Pair> rim_contacts(const mesh::Mesh& mesh, const Lattice& lattice, Contact least) {
  std::vector<std::uint32_t> rim;
  for (std::size_t k = 0; k < mesh.size(); ++k) {
    if (lattice.at_rim(k)) rim.push_back(static_cast<std::uint32_t>(k));
  }
  const mesh::MeshPtr full(std::shared_ptr<void>(), &mesh);  // not owned: the subset ends here
  std::vector<Pair> pairs;
  std::vector<std::uint32_t> known;
  for (const auto& [a, b] : contacts(*mesh::make_subset(full, rim), least)) {
    known.clear();
    lattice.add(rim[a], false, known);
    if (!std::binary_search(known.begin(), known.end(), rim[b])) pairs.emplace_back(rim[a], rim[b]);
  }
  return pairs;
}

Neighbours by_lattice(const mesh::Mesh& mesh, const Lattice& lattice, bool sides_only) {
  std::vector<Pair> more;
  if (mesh.latlon() == nullptr) {
    more = rim_contacts(mesh, lattice, sides_only ? Contact::side : Contact::corner);
    const std::size_t found = more.size();
    for (std::size_t k = 0; k < found; ++k) more.emplace_back(more[k].second, more[k].first);
    std::sort(more.begin(), more.end());
  }
  Neighbours out;
  out.start.reserve(mesh.size() + 1);
  out.start.push_back(0);
  out.cell.reserve(mesh.size() * (sides_only ? 4 : 8));
  auto next = more.begin();
  for (std::size_t k = 0; k < mesh.size(); ++k) {
    const auto first = static_cast<std::ptrdiff_t>(out.cell.size());
    lattice.add(k, sides_only, out.cell);
    const bool extra = next != more.end() && next->first == k;
    for (; next != more.end() && next->first == k; ++next) out.cell.push_back(next->second);
    if (extra) std::sort(out.cell.begin() + first, out.cell.end());
    out.start.push_back(out.cell.size());
  }
  return out;
}

Neighbours find_neighbours(const mesh::Mesh& mesh, bool sides_only) {
  if (const std::optional<Lattice> lattice = lattice_of(mesh)) return by_lattice(mesh, *lattice, sides_only);
  return from_pairs(mesh.size(), contacts(mesh, Contact::corner));
}

}  // namespace

Neighbours from_pairs(std::size_t cells, const std::vector<Pair>& pairs) {
  Neighbours out;
  out.start.assign(cells + 1, 0);
  for (const auto& [a, b] : pairs) {
    ++out.start[a + 1];
    ++out.start[b + 1];
  }
  for (std::size_t k = 0; k < cells; ++k) out.start[k + 1] += out.start[k];
  out.cell.resize(2 * pairs.size());
  std::vector<std::uint64_t> next(out.start.begin(), out.start.end() - 1);
  for (const auto& [a, b] : pairs) {
    out.cell[next[a]++] = b;
    out.cell[next[b]++] = a;
  }
  for (std::size_t k = 0; k < cells; ++k) {
    std::sort(out.cell.begin() + static_cast<std::ptrdiff_t>(out.start[k]),
              out.cell.begin() + static_cast<std::ptrdiff_t>(out.start[k + 1]));
  }
  return out;
}

Neighbours neighbours(const mesh::Mesh& mesh) { return find_neighbours(mesh, false); }
Neighbours side_neighbours(const mesh::Mesh& mesh) { return find_neighbours(mesh, true); }

}  // namespace windrow::overlap
