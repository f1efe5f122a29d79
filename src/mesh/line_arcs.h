// Lines on the globe that one circle arc does not follow closely enough: splitting until arcs do. What the lines are,
// and where their points lie, the callers know.
#pragma once
#include <cstdint>
#include <functional>
#include <limits>
#include <vector>

#include "windrow/sphere/polygon.h"

namespace windrow::mesh {

inline constexpr double kLensTolerance = 1e-11;  ///< of a cell's area: design limit for an edge against its halves
inline constexpr double kLongestChord = 0.5;     ///< arcs stay well under 90 degrees

/// A line whose circle arcs are sought.
struct OpenLine {
  std::uint64_t number;
  sphere::Vec3 from, to;
  double cell_area;                                         ///< of the smaller neighbour, roughly
  double missed = std::numeric_limits<double>::infinity();  ///< at the level before
};

/// Points at the fractions (k + 1) / (inner + 1), k = 0..inner - 1, of every line, line by line.
using PlacePoints = std::function<std::vector<sphere::Vec3>(const std::vector<OpenLine>& lines, std::size_t inner)>;
/// Takes a line that is done: its 2 * parts - 1 inner points, ends and middles of the parts.
using TakeLine = std::function<void(std::uint64_t number, std::vector<sphere::Vec3> inner)>;

/// How closely arcs follow their line.
struct LineRule {
  double tolerance = kLensTolerance;  ///< of the cell's area
  /// Bend every part a little more or less, so that the area between it and its chord is the line's own to far below the
  /// tolerance: cells of exactly known area then need few arcs.
  bool match_area = false;
};

/// Halves the parts of all lines until the area between a part's circle and those of its halves is, summed over the
/// line, at most the rule's tolerance. Lines that still miss that after ten halvings are no smooth lines: they
/// are returned, by number. Runs on all threads; `place` and `take` are called for many lines at once, in no order.
std::vector<OpenLine> split_lines(const std::vector<OpenLine>& lines, const PlacePoints& place, const TakeLine& take,
                                  const LineRule& rule = {});

/// Appends the arcs of a line with these inner points; parts of no length give none.
void append_arcs(const sphere::Vec3& from, const sphere::Vec3* inner, std::size_t count, const sphere::Vec3& to,
                 sphere::Loop& out);

}  // namespace windrow::mesh
