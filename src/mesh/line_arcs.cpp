// The lens criterion: an arc is compared with the arcs of its halves, and where halving no longer helps, with noise.
#include "line_arcs.h"

#include <algorithm>
#include <cmath>
#include <exception>

#include "windrow/sphere/area.h"
#include "windrow/sphere/clip.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

constexpr int kMostLevels = 10;
constexpr std::size_t kBatch = 1 << 10;  // lines a thread splits at a time
constexpr double kNoise = 1e-10;         // rad, 0.6 mm: most that a projection may be off between neighbouring points

// Inner points of the level before: the ends of its parts and their middles.
std::vector<Vec3> every_second(const std::vector<Vec3>& inner) {
  std::vector<Vec3> out;
  for (std::size_t k = 1; k < inner.size(); k += 2) out.push_back(inner[k]);
  return out;
}

// Area between the arc through a, m, b and its chord, positive to the right of the chord.
double lens(const Vec3& a, const Vec3& m, const Vec3& b) {
  if (norm(b - a) <= sphere::kOnCircle) return 0.0;
  const sphere::Arc arc = arc_through(a, b, tilt_through(a, m, b));
  return sphere::lens_area(arc.circle, arc.dtheta);
}

// Area between the arc through a, m, b and the arcs through its halves, where those lie on either side of it: a line
// that bends like an S hides nothing.
double strayed(const Vec3& a, const Vec3& first, const Vec3& m, const Vec3& second, const Vec3& b) {
  const sphere::Arc arc = arc_through(a, b, tilt_through(a, m, b));
  const auto half = [&](const Vec3& from, const Vec3& middle, const Vec3& to) {
    const double length = norm(to - from);
    if (length <= sphere::kOnCircle) return 0.0;
    const double dtheta = 2 * std::asin(std::min(1.0, 0.5 * length / arc.circle.radius));
    return std::abs(sphere::lens_area(arc.circle, std::copysign(dtheta, arc.dtheta)) - lens(from, middle, to));
  };
  return half(a, first, m) + half(m, second, b);
}

// `now`: inner points of the line at one level; `finer`: at the next. The area between them, part by part.
double missed_area(const OpenLine& line, const std::vector<Vec3>& now, const std::vector<Vec3>& finer,
                   bool halves_apart) {
  const auto point = [&](const std::vector<Vec3>& inner, std::size_t k) -> const Vec3& {
    return k == 0 ? line.from : k == inner.size() + 1 ? line.to : inner[k - 1];
  };
  double sum = 0;
  for (std::size_t k = 0; k + 2 <= now.size() + 1; k += 2) {
    const Vec3 &a = point(now, k), &m = point(now, k + 1), &b = point(now, k + 2);
    if (!(norm(b - a) < kLongestChord)) return std::numeric_limits<double>::infinity();
    if (halves_apart) {
      sum += strayed(a, point(finer, 2 * k + 1), m, point(finer, 2 * k + 3), b);
      continue;
    }
    const double halves = lens(a, point(finer, 2 * k + 1), m) + lens(m, point(finer, 2 * k + 3), b);
    sum += std::abs(lens(a, m, b) - halves - sphere::triangle_area(a, m, b));
  }
  return sum;
}

// Moves the middles of the parts until their lenses have the area that arcs an eighth as long find.
void match_area(const OpenLine& line, const PlacePoints& place, std::vector<Vec3>& inner) {
  constexpr std::size_t kFiner = 8;
  const std::size_t fine_inner = (inner.size() + 1) * kFiner - 1;
  const std::vector<Vec3> fine = place({line}, fine_inner);
  const auto at = [&](std::size_t k) -> const Vec3& {
    return k == 0 ? line.from : k == fine_inner + 1 ? line.to : fine[k - 1];
  };
  const std::size_t step = 2 * kFiner;  // from one end of a part to the other
  for (std::size_t part = 0; part * step <= fine_inner; ++part) {
    const Vec3 &a = at(part * step), &b = at((part + 1) * step);
    const double length = norm(b - a);
    if (length <= sphere::kOnCircle) continue;
    double area = 0;
    for (std::size_t k = part * step; k < (part + 1) * step; k += 2) {
      area += lens(at(k), at(k + 1), at(k + 2)) + sphere::triangle_area(a, at(k), at(k + 2));
    }
    const Vec3 left = unit(cross(a + b, b - a));
    Vec3& middle = inner[2 * part];
    // A lens of sagitta s has an area near 2/3 s length; two steps leave nothing.
    for (int again = 0; again < 2; ++again) {
      middle = unit(middle + (1.5 * (lens(a, middle, b) - area) / length) * left);
    }
  }
}

std::vector<OpenLine> split_batch(std::vector<OpenLine> open, const PlacePoints& place, const TakeLine& take,
                                  const LineRule& rule) {
  for (int level = 0; !open.empty() && level <= kMostLevels; ++level) {
    // Level L has 2^L parts and as many middles: 2^(L+1) - 1 inner points.
    const std::size_t inner = (std::size_t{2} << level) - 1;
    const std::size_t next = 2 * inner + 1;
    const std::vector<Vec3> points = place(open, next);
    std::vector<OpenLine> still;
    for (std::size_t k = 0; k < open.size(); ++k) {
      const auto first = points.begin() + static_cast<std::ptrdiff_t>(k * next);
      const std::vector<Vec3> finer(first, first + static_cast<std::ptrdiff_t>(next));
      std::vector<Vec3> now = every_second(finer);
      const OpenLine& line = open[k];
      const double area = missed_area(line, now, finer, rule.match_area);
      // A smooth line misses ever less; where halving does not help, only the projection's own rounding is left, which
      // on cells of some metres exceeds the criterion. The level before is as good then.
      const bool noise = area > 0.5 * line.missed && area <= kNoise * norm(line.to - line.from);
      if (area <= rule.tolerance * line.cell_area) {
        if (rule.match_area) match_area(line, place, now);
        take(line.number, std::move(now));
      } else if (noise) {
        take(line.number, every_second(now));
      } else {
        still.push_back(line);
        still.back().missed = area;
      }
    }
    open = std::move(still);
  }
  return open;
}

}  // namespace

std::vector<OpenLine> split_lines(const std::vector<OpenLine>& lines, const PlacePoints& place, const TakeLine& take,
                                  const LineRule& rule) {
  std::vector<OpenLine> rough;
  std::exception_ptr failure;
#pragma omp parallel for schedule(dynamic) if (lines.size() > kBatch)
  for (std::size_t first = 0; first < lines.size(); first += kBatch) {
    try {
      const auto begin = lines.begin() + static_cast<std::ptrdiff_t>(first);
      const auto end = lines.begin() + static_cast<std::ptrdiff_t>(std::min(lines.size(), first + kBatch));
      const std::vector<OpenLine> left = split_batch({begin, end}, place, take, rule);
#pragma omp critical(windrow_rough_lines)
      rough.insert(rough.end(), left.begin(), left.end());
    } catch (...) {
#pragma omp critical(windrow_split_failure)
      failure = std::current_exception();
    }
  }
  if (failure) std::rethrow_exception(failure);
  std::sort(rough.begin(), rough.end(), [](const OpenLine& a, const OpenLine& b) { return a.number < b.number; });
  return rough;
}

void append_arcs(const Vec3& from, const Vec3* inner, std::size_t count, const Vec3& to, sphere::Loop& out) {
  Vec3 a = from;
  for (std::size_t k = 0; k < count; k += 2) {
    const Vec3 b = k + 1 < count ? inner[k + 1] : to;
    if (norm(b - a) > sphere::kOnCircle) out.push_back(arc_through(a, b, tilt_through(a, inner[k], b)));
    a = b;
  }
}

}  // namespace windrow::mesh
