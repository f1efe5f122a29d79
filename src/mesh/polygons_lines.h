// Rings of polygons as they are drawn: vertices and the straight lines between them in the coordinates of their map.
// What neighbours share is one line here. The globe is not known yet.
#pragma once
#include <array>
#include <cstdint>
#include <optional>
#include <string>
#include <unordered_map>
#include <vector>

#include "windrow/mesh/cell_records.h"

namespace windrow::mesh::polygons {

/// A straight line from the lesser vertex (by x, then y) to the greater one.
struct Line {
  std::uint32_t from = 0, to = 0;
  double dx = 0;  ///< x of `to` less x of `from`, along the line: longitudes may pass 180 degrees
};
struct Step {
  std::uint32_t line = 0;
  bool against = false;
  bool operator==(const Step&) const = default;
};

/// A closed ring without steps of no length.
struct Outline {
  std::vector<Step> steps;
  int winding = 0;       ///< times round the globe, positive eastwards; not 0: the ring holds a pole
  double flat_area = 0;  ///< in map units squared, positive for an anticlockwise ring; without meaning when it winds
};

class Lines {
 public:
  /// Longitudes and latitudes: x counts modulo 360 and the short way is meant.
  explicit Lines(bool geographic) : geographic_(geographic) {}

  Outline add(const PolygonCell::Ring& ring);

  [[nodiscard]] bool geographic() const { return geographic_; }
  [[nodiscard]] const std::vector<std::array<double, 2>>& vertices() const { return vertex_; }
  [[nodiscard]] const std::vector<Line>& lines() const { return line_; }
  [[nodiscard]] std::uint32_t start(const Step& s) const { return s.against ? line_[s.line].to : line_[s.line].from; }
  [[nodiscard]] std::uint32_t end(const Step& s) const { return s.against ? line_[s.line].from : line_[s.line].to; }
  [[nodiscard]] double dx(const Step& s) const { return s.against ? -line_[s.line].dx : line_[s.line].dx; }
  [[nodiscard]] double dy(const Step& s) const { return vertex_[end(s)][1] - vertex_[start(s)][1]; }

 private:
  struct Hash {
    std::size_t operator()(const std::array<std::uint64_t, 2>& k) const {
      return static_cast<std::size_t>((k[0] ^ (k[1] * 0x9e3779b97f4a7c15U)) * 0xff51afd7ed558ccdU);
    }
  };
  std::uint32_t vertex(double x, double y);
  [[nodiscard]] double step_dx(std::uint32_t a, std::uint32_t b, double drawn_dx) const;

  bool geographic_;
  std::vector<std::array<double, 2>> vertex_;
  std::vector<Line> line_;
  std::unordered_map<std::array<std::uint64_t, 2>, std::uint32_t, Hash> vertex_number_, line_number_;
};

/// A place where rings of one part cross each other or themselves, in map coordinates. Touching is no crossing.
std::optional<std::array<double, 2>> find_crossing(const Lines& lines, const std::vector<Outline>& part);

/// Does a hole (which crosses nothing) lie within the outer ring, which does not wind?
bool lies_within(const Lines& lines, const Outline& hole, const Outline& outer);

/// Closed chains of steps that bound the region left of all these rings. What is passed once each way is no boundary:
/// rings to and fro along a seam (to a pole, round the globe) fall into the loops on its sides.
std::vector<std::vector<Step>> boundary(const std::vector<Outline>& part);

}  // namespace windrow::mesh::polygons
