// Meshes that cover the globe, built from scratch for the tests, and what the laws need to look at them.
#pragma once
#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <map>
#include <numbers>
#include <tuple>
#include <vector>

#include "windrow/base/exact_sum.h"
#include "windrow/mesh/mesh.h"
#include "windrow/sphere/area.h"

namespace windrow::test {

inline double longitude_deg(const sphere::Vec3& v) { return std::atan2(v.y, v.x) * 180 / std::numbers::pi; }
inline double latitude_deg(const sphere::Vec3& v) {
  return std::atan2(v.z, std::hypot(v.x, v.y)) * 180 / std::numbers::pi;
}

/// Points and anticlockwise loops of their numbers.
struct Loops {
  std::vector<sphere::Vec3> point;
  std::vector<std::vector<std::uint32_t>> loop;
};

/// The icosahedron with its sides halved `halvings` times, turned so that no corner is a pole.
inline Loops icosahedral(int halvings) {
  Loops out;
  const double golden = 0.5 * (1 + std::sqrt(5.0));
  for (const double a : {-1.0, 1.0}) {
    for (const double b : {-golden, golden}) {
      for (const sphere::Vec3& v : {sphere::Vec3{0, a, b}, {a, b, 0}, {b, 0, a}}) {
        out.point.push_back(unit(sphere::Vec3{v.x, 0.8 * v.y - 0.6 * v.z, 0.6 * v.y + 0.8 * v.z}));
      }
    }
  }
  const auto near = [&](std::uint32_t a, std::uint32_t b) { return dot(out.point[a], out.point[b]) > 0.3; };
  for (std::uint32_t a = 0; a < 12; ++a) {
    for (std::uint32_t b = a + 1; b < 12; ++b) {
      for (std::uint32_t c = b + 1; c < 12; ++c) {
        if (!near(a, b) || !near(b, c) || !near(c, a)) continue;
        const bool left = dot(out.point[a], cross(out.point[b], out.point[c])) > 0;
        out.loop.push_back(left ? std::vector{a, b, c} : std::vector{a, c, b});
      }
    }
  }
  for (int k = 0; k < halvings; ++k) {
    std::map<std::pair<std::uint32_t, std::uint32_t>, std::uint32_t> middle;
    const auto between = [&](std::uint32_t a, std::uint32_t b) {
      const auto [place, fresh] = middle.emplace(std::minmax(a, b), static_cast<std::uint32_t>(out.point.size()));
      if (fresh) out.point.push_back(unit(out.point[a] + out.point[b]));
      return place->second;
    };
    std::vector<std::vector<std::uint32_t>> finer;
    for (const auto& t : out.loop) {
      const std::uint32_t ab = between(t[0], t[1]), bc = between(t[1], t[2]), ca = between(t[2], t[0]);
      for (const auto& part : {std::vector{t[0], ab, ca}, {ab, t[1], bc}, {ca, bc, t[2]}, {ab, bc, ca}}) {
        finer.push_back(part);
      }
    }
    out.loop = std::move(finer);
  }
  return out;
}

/// One cell about every point of a triangle mesh: hexagons, and pentagons about the icosahedron's own corners.
inline Loops dual(const Loops& triangles) {
  Loops out;
  std::vector<std::vector<std::uint32_t>> around(triangles.point.size());
  for (std::uint32_t t = 0; t < triangles.loop.size(); ++t) {
    sphere::Vec3 sum;
    for (const std::uint32_t p : triangles.loop[t]) {
      sum = sum + triangles.point[p];
      around[p].push_back(t);
    }
    out.point.push_back(unit(sum));
  }
  for (std::size_t p = 0; p < around.size(); ++p) {
    const sphere::Vec3& up = triangles.point[p];
    const sphere::Vec3 side = unit(cross(up, std::abs(up.z) < 0.6 ? sphere::Vec3{0, 0, 1} : sphere::Vec3{1, 0, 0}));
    const auto bearing = [&](std::uint32_t t) {
      return std::atan2(dot(out.point[t], cross(up, side)), dot(out.point[t], side));
    };
    std::sort(around[p].begin(), around[p].end(),
              [&](std::uint32_t a, std::uint32_t b) { return bearing(a) < bearing(b); });
    out.loop.push_back(around[p]);
  }
  return out;
}

/// The six faces of a cube, n x n quadrilaterals each between evenly spread angles.
inline Loops cubed(std::size_t n) {
  Loops out;
  const std::array<std::array<sphere::Vec3, 3>, 6> faces{{{{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}},
                                                          {{{0, 1, 0}, {-1, 0, 0}, {0, 0, 1}}},
                                                          {{{-1, 0, 0}, {0, -1, 0}, {0, 0, 1}}},
                                                          {{{0, -1, 0}, {1, 0, 0}, {0, 0, 1}}},
                                                          {{{0, 0, 1}, {0, 1, 0}, {-1, 0, 0}}},
                                                          {{{0, 0, -1}, {0, 1, 0}, {1, 0, 0}}}}};
  for (const auto& [out_of, right, up] : faces) {
    const auto first = static_cast<std::uint32_t>(out.point.size());
    const auto slope = [n](std::size_t k) {
      return std::tan(std::numbers::pi / 4 * (2 * static_cast<double>(k) / static_cast<double>(n) - 1));
    };
    for (std::size_t j = 0; j <= n; ++j) {
      for (std::size_t i = 0; i <= n; ++i) out.point.push_back(unit(out_of + slope(i) * right + slope(j) * up));
    }
    for (std::size_t j = 0; j < n; ++j) {
      for (std::size_t i = 0; i < n; ++i) {
        const auto sw = static_cast<std::uint32_t>(first + j * (n + 1) + i), w = static_cast<std::uint32_t>(n + 1);
        out.loop.push_back({sw, sw + 1, sw + w + 1, sw + w});
      }
    }
  }
  return out;
}

/// Each cell's corners, padded with missing ones.
inline mesh::CellCorners corners_of(const Loops& loops) {
  mesh::CellCorners out;
  for (const auto& loop : loops.loop) out.most = std::max(out.most, loop.size());
  for (const auto& loop : loops.loop) {
    for (std::size_t k = 0; k < out.most; ++k) {
      out.lon_deg.push_back(k < loop.size() ? longitude_deg(loops.point[loop[k]]) : std::nan(""));
      out.lat_deg.push_back(k < loop.size() ? latitude_deg(loops.point[loop[k]]) : std::nan(""));
    }
  }
  out.nx = loops.loop.size();
  return out;
}

inline mesh::FaceNodes faces_of(const Loops& loops) {
  mesh::FaceNodes out;
  for (const auto& p : loops.point) {
    out.lon_deg.push_back(longitude_deg(p));
    out.lat_deg.push_back(latitude_deg(p));
  }
  for (const auto& loop : loops.loop) out.most = std::max(out.most, loop.size());
  for (const auto& loop : loops.loop) {
    for (std::size_t k = 0; k < out.most; ++k) {
      out.nodes.push_back(k < loop.size() ? static_cast<std::int64_t>(loop[k]) : -1);
    }
  }
  return out;
}

inline double total_area(const mesh::Mesh& m) {
  ExactSum sum;
  for (std::size_t k = 0; k < m.size(); ++k) sum.add(m.area(k));
  return sum.value();
}

using ArcBits = std::tuple<double, double, double, double, double, double, double, double, double, double, double>;
/// An arc as it looks from one side; `reversed` as from the other.
inline ArcBits bits_of(const sphere::Arc& a) {
  return {a.from.x,     a.from.y,     a.from.z,     a.to.x,     a.to.y,  a.to.z,
          a.circle.n.x, a.circle.n.y, a.circle.n.z, a.circle.d, a.dtheta};
}

/// How many arcs of all cells have no exact counterpart in the other direction.
inline std::size_t unmatched_arcs(const mesh::Mesh& m) {
  std::map<ArcBits, int> open;
  for (std::size_t k = 0; k < m.size(); ++k) {
    for (const auto& piece : m.cell(k).pieces) {
      for (const auto& loop : piece.loops) {
        for (const auto& arc : loop) {
          ++open[bits_of(arc)];
          --open[bits_of(arc.reversed())];
        }
      }
    }
  }
  return static_cast<std::size_t>(std::count_if(open.begin(), open.end(), [](const auto& o) { return o.second != 0; }));
}

}  // namespace windrow::test
