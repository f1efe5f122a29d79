// How pairs of cells are drawn. Sizes and distances are log-uniform; places crowd at the poles and the date line.
#include "pair_cells.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "../unit/mesh/azimuthal.h"
#include "windrow/base/error.h"

namespace windrow::test {
namespace {

using sphere::Vec3;

constexpr double kPi = std::numbers::pi;

double lon_of(const Vec3& v) { return std::atan2(v.y, v.x) / kDegree; }
double lat_of(const Vec3& v) { return std::atan2(v.z, std::hypot(v.x, v.y)) / kDegree; }

mesh::MeshPtr cell_of(const std::vector<double>& lon, const std::vector<double>& lat, mesh::Sides sides) {
  mesh::CellCorners corners;
  corners.most = lon.size();
  corners.lon_deg = lon;
  corners.lat_deg = lat;
  corners.nx = 1;
  corners.rounding_deg = 1e-13;
  Notices notices;
  return mesh::make_cells(corners, sides, {}, "cell", notices);
}

}  // namespace

double PairMaker::log_uniform(double low, double high) { return std::exp(uniform(std::log(low), std::log(high))); }

PairMaker::Place PairMaker::at(const Vec3& up) {
  const Vec3 right = unit(std::abs(up.z) < 0.8 ? cross(Vec3{0, 0, 1}, up) : cross(up, Vec3{1, 0, 0}));
  return {up, right, cross(up, right)};
}

PairMaker::Place PairMaker::place() {
  const double kind = uniform(0, 1);
  const double away = chance(0.3) ? 0 : log_uniform(1e-8, 0.5);  // rad
  const double lambda = uniform(-180, 180);
  if (kind < 0.25) return at(sphere::point_degrees(lambda, (chance(0.5) ? 1 : -1) * (90 - away / kDegree)));
  const double phi = std::asin(uniform(-1, 1)) / kDegree;
  if (kind < 0.5) return at(sphere::point_degrees(180 + away / kDegree, phi));
  return at(sphere::point_degrees(lambda, kind < 0.6 ? away / kDegree : phi));
}

// Corners within the unit square or so, anticlockwise: triangles to octagons, slivers, and concave quadrilaterals.
PairMaker::Outline PairMaker::outline() {
  Outline out;
  const std::size_t corners = 3 + below(6);
  const double thin = chance(0.3) ? log_uniform(1e-5, 1) : 1, turn = uniform(0, 2 * kPi);
  for (std::size_t k = 0; k < corners; ++k) {
    const double angle = (static_cast<double>(k) + uniform(-0.3, 0.3)) * 2 * kPi / static_cast<double>(corners);
    const double reach = corners == 4 && k == 2 && chance(0.4) ? 0.2 : 1;
    const double x = reach * std::cos(angle), y = thin * reach * std::sin(angle);
    out.push_back({x * std::cos(turn) - y * std::sin(turn), x * std::sin(turn) + y * std::cos(turn)});
  }
  return out;
}

mesh::MeshPtr PairMaker::great(const Place& place, const Outline& outline, double size) {
  std::vector<double> lon, lat;
  for (const Spot& s : outline) {
    const Vec3 v = unit(place.up + (size * s.x) * place.right + (size * s.y) * place.forward);
    lon.push_back(lon_of(v));
    lat.push_back(lat_of(v));
  }
  return cell_of(lon, lat, mesh::Sides::great_circles);
}

CellPair PairMaker::great_circles() {
  while (true) {
    try {
      return try_great_circles();
    } catch (const Error&) {
      ++refused_;
    }
  }
}

CellPair PairMaker::try_great_circles() {
  const Place where = place();
  const double size = log_uniform(1e-6, 0.6);
  const Outline first = outline();
  Outline second;
  std::string relation;
  const std::size_t k = below(first.size());
  const Spot p = first[k], q = first[(k + 1) % first.size()];
  const auto beyond = [&](double depth) {  // to the right of p-q for positive depths
    return Spot{0.5 * (p.x + q.x) + depth * (q.y - p.y), 0.5 * (p.y + q.y) - depth * (q.x - p.x)};
  };
  const auto between = [&](double f) { return Spot{p.x + f * (q.x - p.x), p.y + f * (q.y - p.y)}; };
  switch (below(8)) {
    case 0:
      relation = "identical";
      second = first;
      break;
    case 1:
      relation = "shared side, beside it";
      second = {q, p, beyond(log_uniform(1e-3, 1))};
      break;
    case 2:
      relation = "shared side, over each other";
      second = {p, q, beyond(-log_uniform(1e-3, 1))};
      break;
    case 3: {
      relation = "shared corner";
      second = outline();
      const Spot move{p.x - second[0].x, p.y - second[0].y};
      for (Spot& s : second) s = {s.x + move.x, s.y + move.y};
      second[0] = p;
      break;
    }
    case 4: {
      relation = "one in the other, perhaps touching a side";
      const double scale = uniform(0.05, 0.4);
      for (const Spot& s : first) second.push_back({scale * s.x, scale * s.y});
      if (chance(0.5)) second[(k + 1) % second.size()] = between(uniform(0.1, 0.9));
      break;
    }
    case 5:
      relation = "part of a side in common";
      second = {between(uniform(0, 0.4)), between(uniform(0.6, 1)), beyond((chance(0.5) ? 1 : -1) * uniform(0.01, 1))};
      break;
    case 6:
      relation = "off by rounding";
      second = first;
      for (Spot& s : second) {
        s.x += log_uniform(1e-17, 1e-9) / size * uniform(-1, 1);
        s.y += log_uniform(1e-17, 1e-9) / size * uniform(-1, 1);
      }
      break;
    default: {
      relation = "anywhere near";
      const double scale = log_uniform(0.02, std::min(50.0, 0.6 / size)), off = std::max(1.0, scale);
      const Spot middle{uniform(-off, off), uniform(-off, off)};
      for (const Spot& s : outline()) second.push_back({middle.x + scale * s.x, middle.y + scale * s.y});
    }
  }
  return {great(where, first, size), great(where, second, size), relation};
}

// Edges that start or end where [low, high] does, lie within it, beside it, or anywhere.
std::vector<double> PairMaker::interval(double low, double high, std::string& relation) {
  const double width = high - low;
  switch (below(6)) {
    case 0:
      relation += " same";
      return {low, high};
    case 1:
      relation += " from-start";
      return {low, low + width * log_uniform(1e-6, 3)};
    case 2:
      relation += " to-end";
      return {high - width * log_uniform(1e-6, 3), high};
    case 3:
      relation += " beside";
      return {high, high + width * log_uniform(1e-3, 3)};
    case 4: {
      relation += " within";
      const double start = low + width * uniform(0, 0.5);
      return {start, start + width * log_uniform(1e-6, 0.5)};
    }
    default: {
      relation += " anywhere";
      const double other = width * log_uniform(0.01, 30);
      const double start = uniform(low - std::min(other, 400.0), high);
      return {start, start + other};
    }
  }
}

LatLonPair PairMaker::latlon() {
  LatLonPair out;
  const Vec3 middle = place().up;
  const double width = chance(0.1) ? 360 : log_uniform(1e-4, 300), height = log_uniform(1e-4, 90);
  double west = lon_of(middle) - 0.5 * width, south = lat_of(middle) - 0.5 * height;
  double north = std::min(90.0, south + height);
  south = std::max(-90.0, south);
  if (chance(0.1)) north = 90;
  if (chance(0.1)) south = -90;
  if (chance(0.3)) west = std::round(west);
  out.a = {{west, west + width}, {south, north}};
  std::string along = "along longitude", across = ", latitude";
  auto lon = interval(west, west + width, along), lat = interval(south, north, across);
  if (lon[1] - lon[0] > 360) lon[1] = lon[0] + 360;
  if (chance(0.2)) {
    const double turns = chance(0.5) ? 360 : -360;
    for (double& l : lon) l += turns;
  }
  lat = {std::clamp(lat[0], -90.0, 90.0), std::clamp(lat[1], -90.0, 90.0)};
  if (!(lat[0] < lat[1])) lat = {south, north};
  out.b = {lon, lat};
  out.relation = along + across;
  return out;
}

mesh::Rotation PairMaker::rotation() {
  return {uniform(-180, 180), std::asin(uniform(-1, 1)) / kDegree, chance(0.5) ? 0 : uniform(-180, 180)};
}

mesh::MeshPtr PairMaker::boxed(const Place& place, double size, const mesh::Rotation* rotation) {
  std::vector<double> lon{lon_of(place.up)}, lat{lat_of(place.up)};
  if (rotation != nullptr) mesh::geographic_to_rotated_projector (*rotation)(lon, lat);
  const double half = 0.5 * size / kDegree;
  const double south = std::max(-90.0, lat[0] - half * uniform(0.2, 1)), north = std::min(90.0, lat[0] + half);
  const double stretch = std::max(std::cos(lat[0] * kDegree), chance(0.5) ? 0.02 : 0.3);
  const double east = std::min(180.0, half / stretch);
  mesh::LatLonEdges edges{{lon[0] - east, lon[0] + east}, {south, north}};
  if (rotation != nullptr) return mesh::make_rotated(edges, *rotation, {}, "cell");
  return mesh::make_latlon(edges, {}, "cell");
}

mesh::MeshPtr PairMaker::healpix(double size) {
  const int level = std::clamp(static_cast<int>(std::lround(std::log2(1.0 / size))), 0, 20);
  return mesh::make_healpix({{level, below(std::size_t{12} << (2 * level))}}, 0, {}, "cell");
}

// A polygon of longitudes and latitudes, its sides straight there; a hole now and then.
mesh::MeshPtr PairMaker::polygon(const Place& place, double size) {
  const double half = 0.5 * size / kDegree;
  const double lambda = lon_of(place.up), phi = std::clamp(lat_of(place.up), half - 89.5, 89.5 - half);
  const double wide = half / std::max(0.05, std::cos(phi * kDegree));
  mesh::PolygonCell cell;
  std::vector<mesh::PolygonCell::Ring> rings(chance(0.4) ? 2 : 1);
  const std::size_t corners = 3 + below(7);
  for (std::size_t r = 0; r < rings.size(); ++r) {
    for (std::size_t k = 0; k < corners; ++k) {
      const double angle = 2 * kPi * static_cast<double>(k) / static_cast<double>(corners);
      const double reach = (r == 0 ? uniform(0.5, 1) : 0.2);
      rings[r].push_back({lambda + reach * wide * std::cos(angle), phi + reach * half * std::sin(angle)});
    }
  }
  cell.parts = {rings};
  return mesh::make_polygons(
      {cell}, {"cell"}, [](std::vector<double>&, std::vector<double>&) {}, {}, "degrees", "cell");
}

mesh::MeshPtr PairMaker::any(const Place& place, double size, std::string& kind) {
  switch (below(7)) {
    case 0:
      kind = "latitude-longitude";
      return boxed(place, size, nullptr);
    case 1: {
      kind = "rotated";
      const mesh::Rotation r = rotation();
      return boxed(place, size, &r);
    }
    case 2:
      kind = "projected";
      return azimuthal_mesh(
          {lon_of(place.up) + uniform(-5, 5), std::clamp(lat_of(place.up) + uniform(-9, 9), -90., 90.)}, 1, 1,
          std::min(size, 0.4) * kRadius_m, uniform(-1e6, 1e6), uniform(-1e6, 1e6));
    case 3:
      kind = "great circles";
      return great(place, outline(), 0.5 * size);
    case 4: {
      kind = "sides along parallels";
      const double half = 0.5 * size / kDegree, phi = std::clamp(lat_of(place.up), -89 + half, 89 - half);
      const double wide = std::min(35.0, half / std::cos(phi * kDegree)), lambda = lon_of(place.up);
      return cell_of({lambda - wide, lambda + wide, lambda + wide, lambda - wide},
                     {phi - half, phi - half, phi + half, phi + half}, mesh::Sides::parallels);
    }
    case 5:
      kind = "HEALPix";
      return healpix(size);
    default:
      kind = "polygon";
      return polygon(place, std::max(size, 1e-4));  // smaller ones are refused
  }
}

// A box with corners where a latitude-longitude cell has its own, its sides along other circles or not.
mesh::MeshPtr PairMaker::related_box(const mesh::Mesh& a, std::string& relation) {
  const auto& lon = a.latlon()->lon_deg;
  const auto& lat = a.latlon()->lat_deg;
  const double step = lon[1] - lon[0];
  const double w = chance(0.5) ? lon[0] : lon[1], e = w + step * (chance(0.5) ? 1 : uniform(0.2, 1));
  const double s = lat[0], n = chance(0.5) ? lat[1] : lat[0] + (lat[1] - lat[0]) * uniform(0.3, 0.9);
  const bool parallels = chance(0.5);
  relation = parallels ? "box of shared corners, sides along parallels" : "box of shared corners, great circles";
  return cell_of({w, e, e, w}, {s, s, n, n}, parallels ? mesh::Sides::parallels : mesh::Sides::great_circles);
}

CellPair PairMaker::mixed() {
  while (true) {
    const Place where = place();
    const double size = log_uniform(1e-6, 0.9);
    std::string kind, other;
    CellPair out;
    out.a = any(where, size, kind);
    const auto* edges = out.a->latlon();
    if (kind == "latitude-longitude" && edges->lon_deg[1] - edges->lon_deg[0] < 80 && chance(0.4)) {
      out.b = related_box(*out.a, other);
    } else if (kind == "rotated" && chance(0.3)) {
      mesh::Rotation near = *out.a->rotation();
      near.pole_lat_deg = std::min(90.0, near.pole_lat_deg + log_uniform(1e-15, 1));
      other = "rotated a little more";
      out.b = mesh::make_rotated(*edges, near, {}, "cell");
    } else {
      const double own = std::sqrt(out.a->area(0)), reach = own * log_uniform(0.1, 3);
      const Place middle = at(sphere::point(out.a->centre(0)));
      const Vec3 off = uniform(-reach, reach) * middle.right + uniform(-reach, reach) * middle.forward;
      out.b = any(at(unit(middle.up + off)), std::min(0.9, own * log_uniform(0.05, 20)), other);
    }
    out.relation = kind + " and " + other;
    if (kind != "great circles" || other != "great circles") return out;
  }
}

}  // namespace windrow::test
