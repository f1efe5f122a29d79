// Polygons of maps as cells: lines are bent once, rings are turned so that the region is on their left, what is too
// wide for one piece is cut.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <exception>
#include <map>
#include <numbers>
#include <tuple>

#include "edged_mesh.h"
#include "line_arcs.h"
#include "polygons_cut.h"
#include "polygons_lines.h"
#include "surface.h"
#include "windrow/base/error.h"
#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh {
namespace {

using polygons::Line;
using polygons::Lines;
using polygons::Outline;
using polygons::Step;
using sphere::Vec3;

constexpr double kPi = std::numbers::pi;
constexpr double kShort = 1e-13;         // rad, 0.6 um: a line's bend is below rounding
constexpr double kFlat = 1e-13;          // area over perimeter squared of what is no region
constexpr double kSpeck = 1e-16;         // sr, 0.004 m2: lost in the rounding of directions
constexpr double kHalfGlobe = 1e-9;      // relative: more than half by this is over half
constexpr std::size_t kBatch = 1 << 15;  // points a projection call

// One part of a cell.
struct Part {
  std::size_t cell;
  std::vector<Outline> rings;            // the outer one first
  std::vector<std::vector<Step>> loops;  // what bounds the region, which is on their left
  bool wide = false;
};

class Builder {
 public:
  Builder(const std::vector<PolygonCell>& cells, const std::vector<std::string>& names, const Projector& to_geographic,
          bool geographic, const Earth& earth, const std::string& place)
      : cells_(cells), names_(names), to_geographic_(to_geographic), earth_(earth), place_(place), lines_(geographic) {}
  EdgedCells build();

 private:
  [[noreturn]] void refuse(std::size_t cell, const std::string& what) const {
    throw Error(Failure::data, place_, fmt::format("polygon \"{}\" {}", names_[cell], what));
  }
  [[nodiscard]] std::size_t cell_of_line(std::uint32_t line) const;
  void read();
  void check(const Part& part) const;
  [[nodiscard]] std::vector<Vec3> project(std::vector<double> x, std::vector<double> y) const;
  void place_vertices();
  void find_sense();
  [[nodiscard]] double rough_area(const Outline& ring) const;
  void bend_lines();
  void append(const Step& step, sphere::Loop& out) const;
  [[nodiscard]] sphere::Loop loop_of(const std::vector<Step>& steps) const;
  void turn_rings(Part& part) const;
  void bound(Part& part);
  void lay_edges();
  void lay_broken(std::uint32_t line);
  std::uint32_t add_node(const Vec3& at) {
    out_.node.push_back(at);
    return static_cast<std::uint32_t>(out_.node.size() - 1);
  }
  void append_uses(const std::vector<Step>& steps);
  void add_pieces(const Part& part);
  void add_cut_pieces(const Part& part);
  void find_centres();

  const std::vector<PolygonCell>& cells_;
  const std::vector<std::string>& names_;
  const Projector& to_geographic_;
  const Earth& earth_;
  const std::string& place_;
  Lines lines_;
  std::vector<Part> parts_;
  double sense_ = 1;                       // -1: y runs to the right of x on the globe
  std::vector<std::vector<Vec3>> bent_;    // inner points of every line; none: too short to bend
  std::vector<std::uint8_t> broken_;       // lines of wide parts: an edge for every arc
  std::vector<std::uint32_t> first_edge_;  // lines + 1
  EdgedCells out_;                         // node k is vertex k, then those within broken lines and on cuts
};

std::size_t Builder::cell_of_line(std::uint32_t line) const {
  for (const Part& part : parts_) {
    for (const Outline& ring : part.rings) {
      for (const Step& step : ring.steps) {
        if (step.line == line) return part.cell;
      }
    }
  }
  return 0;
}

void Builder::read() {
  for (std::size_t k = 0; k < cells_.size(); ++k) {
    if (cells_[k].parts.empty()) refuse(k, "is empty, expected at least one part");
    for (const auto& rings : cells_[k].parts) {
      if (rings.empty()) refuse(k, "has a part without rings");
      parts_.push_back({k, {}, {}});
      for (const PolygonCell::Ring& ring : rings) {
        for (const auto& [x, y] : ring) {
          if (!std::isfinite(x) || !std::isfinite(y)) refuse(k, "has a vertex whose coordinates are no numbers");
        }
        parts_.back().rings.push_back(lines_.add(ring));
      }
    }
  }
}

void Builder::check(const Part& part) const {
  if (const auto at = polygons::find_crossing(lines_, part.rings)) {
    refuse(part.cell, fmt::format("crosses itself near {:.9g}, {:.9g}", (*at)[0], (*at)[1]));
  }
  for (const Outline& ring : part.rings) {
    double length = 0;
    for (const Step& step : ring.steps) length += std::hypot(lines_.dx(step), lines_.dy(step));
    if (ring.steps.size() < 2 || (ring.winding == 0 && !(std::abs(ring.flat_area) > kFlat * length * length))) {
      refuse(part.cell, "has no area");
    }
    if (std::abs(ring.winding) > 1) {
      refuse(part.cell, fmt::format("runs {} times round the globe", std::abs(ring.winding)));
    }
  }
  for (std::size_t k = 1; k < part.rings.size() && part.rings.front().winding == 0; ++k) {
    if (polygons::lies_within(lines_, part.rings[k], part.rings.front())) continue;
    const auto& at = lines_.vertices()[lines_.start(part.rings[k].steps.front())];
    refuse(part.cell, fmt::format("has a hole outside its outer ring, at {:.9g}, {:.9g}", at[0], at[1]));
  }
}

std::vector<Vec3> Builder::project(std::vector<double> x, std::vector<double> y) const {
  to_geographic_(x, y);
  std::vector<Vec3> out(x.size());
  for (std::size_t k = 0; k < x.size(); ++k) {
    const bool placed = std::isfinite(x[k]) && std::isfinite(y[k]) && std::abs(y[k]) <= 90 + 1e-9;
    out[k] = placed ? direction_degrees(x[k], std::clamp(y[k], -90.0, 90.0), earth_)
                    : Vec3{std::numeric_limits<double>::quiet_NaN(), 0, 0};
  }
  return out;
}

void Builder::place_vertices() {
  const auto& vertices = lines_.vertices();
  out_.node.resize(vertices.size());
  std::exception_ptr failure;
#pragma omp parallel for schedule(dynamic)
  for (std::size_t first = 0; first < vertices.size(); first += kBatch) {
    try {
      std::vector<double> x, y;
      for (std::size_t k = first; k < std::min(vertices.size(), first + kBatch); ++k) {
        x.push_back(vertices[k][0]);
        y.push_back(vertices[k][1]);
      }
      const std::vector<Vec3> points = project(std::move(x), std::move(y));
      std::copy(points.begin(), points.end(), out_.node.begin() + static_cast<std::ptrdiff_t>(first));
    } catch (...) {
#pragma omp critical(windrow_vertices_failure)
      failure = std::current_exception();
    }
  }
  if (failure) std::rethrow_exception(failure);
  for (std::uint32_t k = 0; k < lines_.lines().size(); ++k) {
    for (const std::uint32_t vertex : {lines_.lines()[k].from, lines_.lines()[k].to}) {
      if (!std::isnan(out_.node[vertex].x)) continue;
      refuse(cell_of_line(k),
             fmt::format("has no place on the globe at {}, {}", vertices[vertex][0], vertices[vertex][1]));
    }
  }
}

// Which way x and y turn on the globe, from a small step each way at the first vertex.
void Builder::find_sense() {
  if (lines_.geographic() || lines_.lines().empty()) return;
  const Line& line = lines_.lines().front();
  const auto& at = lines_.vertices()[line.from];
  const auto& to = lines_.vertices()[line.to];
  const double h = 1e-3 * std::hypot(to[0] - at[0], to[1] - at[1]);
  for (const double sign : {1.0, -1.0}) {  // the map may end at the vertex
    const std::vector<Vec3> p = project({at[0], at[0] + sign * h, at[0]}, {at[1], at[1], at[1] + sign * h});
    const double turn = dot(p[0], cross(p[1] - p[0], p[2] - p[0]));
    if (std::isnan(turn) || turn == 0) continue;
    sense_ = turn > 0 ? 1 : -1;
    return;
  }
}

// Enough to scale a tolerance by: between lines of longitude and latitude the integral of sin(phi) d(lambda), elsewhere
// the area between great circles.
double Builder::rough_area(const Outline& ring) const {
  if (!lines_.geographic()) {
    sphere::Loop chords;
    for (const Step& step : ring.steps) {
      chords.push_back({out_.node[lines_.start(step)], out_.node[lines_.end(step)], {}, 0});
    }
    return std::abs(sphere::loop_area(chords));
  }
  double sum = 0;
  for (const Step& step : ring.steps) {
    const double south = Angle::degrees(lines_.vertices()[lines_.start(step)][1]).radians();
    const double half = 0.5 * Angle::degrees(lines_.dy(step)).radians();
    const double mean = std::sin(south + half) * (half == 0 ? 1 : std::sin(half) / half);
    sum += mean * Angle::degrees(lines_.dx(step)).radians();
  }
  return ring.winding == 0 ? std::abs(sum) : 2 * kPi - std::abs(sum);
}

void Builder::bend_lines() {
  const std::vector<Line>& lines = lines_.lines();
  std::vector<double> cell_area(cells_.size());
  for (const Part& part : parts_) cell_area[part.cell] += rough_area(part.rings.front());
  std::vector<double> smallest(lines.size(), 4 * kPi);
  for (const Part& part : parts_) {
    for (const Outline& ring : part.rings) {
      for (const Step& step : ring.steps) smallest[step.line] = std::min(smallest[step.line], cell_area[part.cell]);
    }
  }
  std::vector<OpenLine> open;
  for (std::uint32_t k = 0; k < lines.size(); ++k) {
    const Vec3 &from = out_.node[lines[k].from], &to = out_.node[lines[k].to];
    if (norm(to - from) > kShort) open.push_back({k, from, to, smallest[k]});
  }
  bent_.resize(lines.size());
  const auto place = [&](const std::vector<OpenLine>& some, std::size_t inner) {
    std::vector<double> x, y;
    for (const OpenLine& one : some) {
      const Line& line = lines[one.number];
      const auto &from = lines_.vertices()[line.from], &to = lines_.vertices()[line.to];
      for (std::size_t k = 1; k <= inner; ++k) {
        const double f = static_cast<double>(k) / static_cast<double>(inner + 1);
        x.push_back(from[0] + f * line.dx);
        y.push_back(from[1] + f * (to[1] - from[1]));
      }
    }
    std::vector<Vec3> points = project(std::move(x), std::move(y));
    for (std::size_t k = 0; k < points.size(); ++k) {
      if (!std::isnan(points[k].x)) continue;
      refuse(cell_of_line(static_cast<std::uint32_t>(some[k / inner].number)), "reaches beyond its projection");
    }
    return points;
  };
  const std::vector<OpenLine> rough = split_lines(
      open, place, [&](std::uint64_t number, std::vector<Vec3> inner) { bent_[number] = std::move(inner); });
  if (rough.empty()) return;
  const auto number = static_cast<std::uint32_t>(rough.front().number);
  const auto &from = lines_.vertices()[lines[number].from], &to = lines_.vertices()[lines[number].to];
  refuse(cell_of_line(number), fmt::format("has a side from {}, {} to {}, {} that is no smooth line on the globe",
                                           from[0], from[1], to[0], to[1]));
}

void Builder::append(const Step& step, sphere::Loop& out) const {
  const Line& line = lines_.lines()[step.line];
  const Vec3 &from = out_.node[line.from], &to = out_.node[line.to];
  const std::size_t before = out.size();
  const std::vector<Vec3>& inner = bent_[step.line];
  if (!inner.empty()) {
    append_arcs(from, inner.data(), inner.size(), to, out);
  } else if (norm(to - from) > sphere::kOnCircle) {
    out.push_back(arc_through(from, to, 0));
  }
  if (!step.against) return;
  std::reverse(out.begin() + static_cast<std::ptrdiff_t>(before), out.end());
  for (std::size_t k = before; k < out.size(); ++k) out[k] = out[k].reversed();
}

sphere::Loop Builder::loop_of(const std::vector<Step>& steps) const {
  sphere::Loop loop;
  for (const Step& step : steps) append(step, loop);
  return loop;
}

// A ring that holds a pole has no inside on the map: its smaller side is meant.
void Builder::turn_rings(Part& part) const {
  for (std::size_t k = 0; k < part.rings.size(); ++k) {
    Outline& ring = part.rings[k];
    const bool anticlockwise =
        ring.winding == 0 ? ring.flat_area * sense_ > 0 : sphere::loop_area(loop_of(ring.steps)) > 0;
    if (anticlockwise == (k == 0)) continue;
    std::reverse(ring.steps.begin(), ring.steps.end());
    for (Step& step : ring.steps) step.against = !step.against;
  }
}

void Builder::bound(Part& part) {
  turn_rings(part);
  std::vector<std::vector<Step>> loops = polygons::boundary(part.rings);
  part.rings.clear();
  sphere::Piece region;
  double area = 0;
  std::vector<std::pair<double, std::size_t>> by_area;
  for (std::size_t k = 0; k < loops.size(); ++k) {
    sphere::Loop loop = loop_of(loops[k]);
    if (loop.empty()) continue;  // along a pole, left of a seam
    by_area.emplace_back(-sphere::loop_area(loop), k);
    area -= by_area.back().first;
    region.loops.push_back(std::move(loop));
  }
  area = std::remainder(area, 4 * kPi);
  if (region.loops.empty() || std::abs(area) <= kSpeck) refuse(part.cell, "has no area");
  if (area < 0) area += 4 * kPi;
  if (area > 2 * kPi * (1 + kHalfGlobe)) {
    refuse(part.cell, "covers more than half of the globe in one part, expected smaller parts");
  }
  std::sort(by_area.begin(), by_area.end());  // outer loops first
  for (const auto& [negative, k] : by_area) part.loops.push_back(std::move(loops[k]));
  part.wide = polygons::too_wide(region);
  if (!part.wide) return;
  for (const std::vector<Step>& steps : part.loops) {
    for (const Step& step : steps) broken_[step.line] = 1;
  }
}

void Builder::lay_broken(std::uint32_t number) {
  sphere::Loop arcs;
  append({number, false}, arcs);
  std::uint32_t from = lines_.lines()[number].from;
  for (std::size_t k = 0; k < arcs.size(); ++k) {
    const std::uint32_t end = k + 1 == arcs.size() ? lines_.lines()[number].to : add_node(arcs[k].to);
    std::vector<std::uint32_t> ends;
    for (const Vec3& at : polygons::axis_crossings(arcs[k])) ends.push_back(add_node(at));
    ends.push_back(end);
    if (ends.size() == 1) {
      const Vec3 middle = bent_[number].empty() ? point_on(arcs[k], 0.5) : bent_[number][2 * k];
      out_.add_bent(from, end, {&middle, 1});
      from = end;
      continue;
    }
    for (const std::uint32_t to : ends) {
      const double half = 0.5 * (norm(out_.node[to] - arcs[k].from) + norm(out_.node[from] - arcs[k].from));
      const Vec3 middle = point_on(arcs[k], half / norm(arcs[k].to - arcs[k].from));
      out_.add_bent(from, to, {&middle, 1});
      from = to;
    }
  }
}

void Builder::lay_edges() {
  for (std::uint32_t k = 0; k < lines_.lines().size(); ++k) {
    first_edge_.push_back(static_cast<std::uint32_t>(out_.edge.size()));
    const Line& line = lines_.lines()[k];
    if (norm(out_.node[line.to] - out_.node[line.from]) <= sphere::kOnCircle) continue;
    if (broken_[k] != 0) {
      lay_broken(k);
    } else if (bent_[k].empty()) {
      out_.add_edge(line.from, line.to);
    } else {
      out_.add_bent(line.from, line.to, bent_[k]);
    }
  }
  first_edge_.push_back(static_cast<std::uint32_t>(out_.edge.size()));
}

void Builder::append_uses(const std::vector<Step>& steps) {
  for (const Step& step : steps) {
    const std::uint32_t first = first_edge_[step.line], last = first_edge_[step.line + 1];
    for (std::uint32_t k = first; k < last; ++k) {
      out_.use.push_back(step.against ? 2 * (last - 1 - (k - first)) + 1 : 2 * k);
    }
  }
}

void Builder::add_pieces(const Part& part) {
  if (part.wide) return add_cut_pieces(part);
  for (const std::vector<Step>& steps : part.loops) {
    append_uses(steps);
    out_.close_loop();
  }
  out_.piece_start.push_back(out_.loops());
}

// Edges of the region are found again in its pieces by their ends; what else bounds a piece is new.
void Builder::add_cut_pieces(const Part& part) {
  using Key = std::tuple<double, double, double>;
  const auto key = [](const Vec3& p) { return Key{p.x, p.y, p.z}; };
  const std::size_t first_use = out_.use.size();
  for (const std::vector<Step>& steps : part.loops) append_uses(steps);
  std::map<Key, std::uint32_t> node;
  std::map<std::pair<Key, Key>, EdgedCells::Use> use;
  sphere::Piece region;
  std::size_t place = first_use;
  for (const std::vector<Step>& steps : part.loops) {
    std::size_t count = 0;
    for (const Step& step : steps) count += first_edge_[step.line + 1] - first_edge_[step.line];
    region.loops.emplace_back();
    for (std::size_t k = 0; k < count; ++k, ++place) {
      const EdgedCells::Use u = out_.use[place];
      out_.arcs(u, region.loops.back());
      const sphere::Arc& arc = region.loops.back().back();
      use.emplace(std::pair(key(arc.from), key(arc.to)), u);
      node.emplace(key(arc.from), out_.start_node(u));
    }
  }
  out_.use.resize(first_use);
  const auto node_at = [&](const Vec3& p) {
    const auto found = node.find(key(p));
    return found != node.end() ? found->second : node[key(p)] = add_node(p);
  };
  for (const sphere::Piece& piece : polygons::octants(region)) {
    for (const sphere::Loop& loop : piece.loops) {
      for (const sphere::Arc& arc : loop) {
        if (norm(arc.to - arc.from) <= sphere::kOnCircle) continue;
        const auto found = use.find({key(arc.from), key(arc.to)});
        if (found != use.end()) {
          out_.use.push_back(found->second);
          continue;
        }
        const Vec3 middle = point_on(arc, 0.5);
        const std::uint32_t from = node_at(arc.from), to = node_at(arc.to);
        const std::uint32_t edge = arc.circle.d == 0 ? out_.add_edge(from, to) : out_.add_bent(from, to, {&middle, 1});
        out_.use.push_back(2 * edge);
      }
      out_.close_loop();
    }
    out_.piece_start.push_back(out_.loops());
  }
}

// Centres are the directions of the regions' centres of mass.
void Builder::find_centres() {
  for (std::size_t k = 0; k + 1 < out_.cell_start.size(); ++k) {
    Vec3 sum;
    for (std::size_t p = out_.cell_start[k]; p < out_.cell_start[k + 1]; ++p) {
      sphere::Piece piece;
      for (std::size_t l = out_.piece_start[p]; l < out_.piece_start[p + 1]; ++l) {
        piece.loops.emplace_back();
        for (const EdgedCells::Use use : out_.loop(l)) out_.arcs(use, piece.loops.back());
      }
      if (piece.loops.empty() || piece.loops.front().empty()) continue;
      sum = sum + sphere::moment(piece, piece.loops.front().front().from);
    }
    const GeoPoint centre = position_of(sum, earth_);
    out_.centre_lon_deg.push_back(centre.longitude.degrees());
    out_.centre_lat_deg.push_back(centre.latitude.degrees());
  }
}

EdgedCells Builder::build() {
  read();
  for (const Part& part : parts_) check(part);
  place_vertices();
  find_sense();
  bend_lines();
  broken_.resize(lines_.lines().size());
  for (Part& part : parts_) bound(part);
  lay_edges();
  out_.piece_start = {0};
  out_.cell_start = {0};
  std::size_t next = 0;
  for (std::size_t k = 0; k < cells_.size(); ++k) {
    for (; next < parts_.size() && parts_[next].cell == k; ++next) add_pieces(parts_[next]);
    out_.cell_start.push_back(out_.piece_start.size() - 1);
  }
  find_centres();
  return std::move(out_);
}

// Longitudes and latitudes are what a projector leaves alone.
bool is_identity(const Projector& to_geographic) {
  const std::vector<double> lon = {-170, 0.25, 10, 33, 179}, lat = {-45, 0, 20.5, -80, 61};
  std::vector<double> x = lon, y = lat;
  to_geographic(x, y);
  return x == lon && y == lat;
}

}  // namespace

MeshPtr make_polygons(std::vector<PolygonCell> cells, std::vector<std::string> names, const Projector& to_geographic,
                      const Earth& earth, const std::string& crs_key, const std::string& place) {
  if (cells.empty()) throw Error(Failure::data, place, "no polygons, expected at least one");
  if (names.size() != cells.size()) {
    throw Error(Failure::defect, place, fmt::format("{} polygons with {} names", cells.size(), names.size()));
  }
  EdgedCells edged = Builder(cells, names, to_geographic, is_identity(to_geographic), earth, place).build();
  EdgedTraits traits;
  traits.earth = earth;
  traits.kind = "polygons " + crs_key;
  traits.description = fmt::format("{} polygon{} ({})", cells.size(), cells.size() == 1 ? "" : "s", crs_key);
  traits.overlapping = true;
  traits.name = [names = std::move(names)](std::size_t k) { return fmt::format("polygon \"{}\"", names[k]); };
  return std::make_shared<EdgedMesh>(std::move(edged), std::move(traits), place);
}

}  // namespace windrow::mesh
