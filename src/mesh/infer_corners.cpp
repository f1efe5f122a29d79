// Corners of curvilinear cells where a file gives centres only.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "surface.h"
#include "windrow/base/error.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh {
namespace {

using sphere::Vec3;

constexpr double kLargestGap_deg = 20;
constexpr double kGapOfMedian = 4;
constexpr double kSamePlace_deg = 1e-6;
constexpr double kSeam = 0.5;  // of a spacing: how far the first column may be from where the last one's goes on

double angle_deg(const Vec3& a, const Vec3& b) {
  return Angle::radians(2 * std::asin(std::min(1.0, 0.5 * norm(b - a)))).degrees();
}

// The place as far beyond `last` as `before` is this side of it.
Vec3 beyond(const Vec3& last, const Vec3& before) { return unit((2 * dot(last, before)) * last - before); }

bool mostly(std::size_t part, std::size_t whole) { return 10 * part >= 9 * whole; }

// Centres with one more row and column on every side.
class Centres {
 public:
  Centres(const std::vector<double>& lon, const std::vector<double>& lat, std::size_t ny, std::size_t nx,
          const std::string& place)
      : ny_(ny), nx_(nx), place_(place), point_((ny + 2) * (nx + 2)) {
    for (std::size_t j = 0; j < ny; ++j) {
      for (std::size_t i = 0; i < nx; ++i) {
        const double l = lon[j * nx + i], p = lat[j * nx + i];
        if (!std::isfinite(l) || !(std::abs(p) <= 90)) {
          throw Error(Failure::data, place,
                      fmt::format("the cell at row {}, column {} (from 0) has its centre at longitude {}, latitude {}: "
                                  "its corners cannot be inferred",
                                  j, i, l, p));
        }
        spot(j + 1, i + 1) = sphere::point_degrees(l, p);
      }
    }
  }

  [[nodiscard]] const Vec3& at(std::size_t j, std::size_t i) const { return point_[j * (nx_ + 2) + i]; }

  // Error(data) where two neighbours along an axis are too far apart.
  void check_gaps(bool along_x) const {
    const std::size_t rows = along_x ? ny_ : ny_ - 1, columns = along_x ? nx_ - 1 : nx_;
    const auto next = [&](std::size_t j, std::size_t i) { return along_x ? at(j + 1, i + 2) : at(j + 2, i + 1); };
    std::vector<double> gaps(rows * columns);
    for (std::size_t k = 0; k < gaps.size(); ++k) {
      gaps[k] = angle_deg(at(k / columns + 1, k % columns + 1), next(k / columns, k % columns));
    }
    std::vector<double> sorted = gaps;
    const auto middle = sorted.begin() + static_cast<std::ptrdiff_t>(sorted.size() / 2);
    std::nth_element(sorted.begin(), middle, sorted.end());
    const double most = std::min(kLargestGap_deg, kGapOfMedian * *middle);
    const auto widest = std::max_element(gaps.begin(), gaps.end());
    if (*widest <= most) return;
    const auto k = static_cast<std::size_t>(widest - gaps.begin());
    const std::size_t j = k / columns, i = k % columns;
    throw Error(
        Failure::data, place_,
        fmt::format("corners cannot be inferred: the centres at row {}, column {} and row {}, column {} (from 0) "
                    "are {:.3g} degrees apart (half of all neighbours: below {:.3g})",
                    j, i, along_x ? j : j + 1, along_x ? i + 1 : i, *widest, *middle));
  }

  void add_ring() {
    closed_ = closes();
    for (std::size_t j = 1; j <= ny_; ++j) {
      spot(j, 0) = closed_ ? at(j, nx_) : beyond(at(j, 1), at(j, 2));
      spot(j, nx_ + 1) = closed_ ? at(j, 1) : beyond(at(j, nx_), at(j, nx_ - 1));
    }
    continue_rows(0, 1, 2);
    continue_rows(ny_ + 1, ny_, ny_ - 1);
  }

  // Corners of line j: mean directions. The outermost line of rows that close round ends at a point (a pole, mostly)
  // when it leaves a gap of less than half a row there: rows are rarely spaced so that the last one just reaches it.
  [[nodiscard]] std::vector<Vec3> corners(std::size_t j) const {
    std::vector<Vec3> line;
    Vec3 sum;
    for (std::size_t i = 0; i <= nx_; ++i) {
      line.push_back(unit(at(j, i) + at(j, i + 1) + at(j + 1, i) + at(j + 1, i + 1)));
      if (i > 0) sum = sum + line.back();
    }
    if (!closed_ || (j > 0 && j < ny_) || !(norm(sum) > 0)) return line;
    const Vec3 end = unit(sum);
    const std::size_t row = j == 0 ? 1 : ny_ - 1;
    double gap = 0, spacing = 360;
    for (std::size_t i = 1; i <= nx_; ++i) {
      gap = std::max(gap, angle_deg(end, line[i]));
      spacing = std::min(spacing, angle_deg(at(row, i), at(row + 1, i)));
    }
    if (gap < kSeam * spacing) std::fill(line.begin(), line.end(), end);
    return line;
  }

 private:
  [[nodiscard]] Vec3& spot(std::size_t j, std::size_t i) { return point_[j * (nx_ + 2) + i]; }
  // Do rows go on from their last column to their first? None may leave a gap there; where columns bend much, as about
  // a pole on land, a row or two may miss the place it was to go on to.
  [[nodiscard]] bool closes() const {
    if (nx_ < 3) return false;
    std::size_t met = 0;
    for (std::size_t j = 1; j <= ny_; ++j) {
      const double before = angle_deg(at(j, nx_), at(j, nx_ - 1)), after = angle_deg(at(j, 1), at(j, 2));
      const double miss = angle_deg(beyond(at(j, nx_), at(j, nx_ - 1)), at(j, 1));
      if (!is_point(j) && angle_deg(at(j, nx_), at(j, 1)) > 2 * std::max(before, after)) return false;
      met += is_point(j) || miss <= kSeam * before ? 1 : 0;
    }
    return mostly(met, ny_);
  }
  // Fills the row beyond the outermost one, `last`: its own place, the other half of a fold, or where the rows lead.
  void continue_rows(std::size_t outside, std::size_t last, std::size_t before) {
    const bool point = is_point(last), folded = !point && folds(last, before);
    for (std::size_t i = 0; i < nx_ + 2; ++i) {
      spot(outside, i) = point ? at(last, 1) : folded ? at(last, nx_ + 1 - i) : beyond(at(last, i), at(before, i));
    }
  }
  // Does the outermost row go on in its own other half, run backwards? Ocean grids with two poles on land close up so
  // along the line between these; at the poles themselves columns bend too much to tell.
  [[nodiscard]] bool folds(std::size_t last, std::size_t before) const {
    std::size_t met = 0;
    for (std::size_t i = 1; i <= nx_; ++i) {
      const double miss = angle_deg(beyond(at(last, i), at(before, i)), at(last, nx_ + 1 - i));
      met += miss <= kSeam * angle_deg(at(last, i), at(before, i)) ? 1 : 0;
    }
    return mostly(met, nx_);
  }
  // A row of centres that is one place: at a pole, listed with every longitude.
  [[nodiscard]] bool is_point(std::size_t j) const {
    for (std::size_t i = 2; i <= nx_; ++i) {
      if (angle_deg(at(j, 1), at(j, i)) > kSamePlace_deg) return false;
    }
    return true;
  }

  std::size_t ny_, nx_;
  bool closed_ = false;
  const std::string& place_;
  std::vector<Vec3> point_;
};

}  // namespace

CellCorners infer_corners(const std::vector<double>& centre_lon_deg, const std::vector<double>& centre_lat_deg,
                          std::size_t ny, std::size_t nx, const std::string& place) {
  if (ny < 2 || nx < 2) {
    throw Error(Failure::data, place,
                fmt::format("corners cannot be inferred from {} x {} centres, expected two along each axis", ny, nx));
  }
  if (centre_lon_deg.size() != ny * nx || centre_lat_deg.size() != ny * nx) {
    throw Error(Failure::data, place,
                fmt::format("{} longitudes and {} latitudes of {} x {} centres", centre_lon_deg.size(),
                            centre_lat_deg.size(), ny, nx));
  }
  Centres centres(centre_lon_deg, centre_lat_deg, ny, nx, place);
  centres.check_gaps(true);
  centres.check_gaps(false);
  centres.add_ring();
  std::vector<double> lon((ny + 1) * (nx + 1)), lat(lon.size());
  for (std::size_t j = 0; j <= ny; ++j) {
    const std::vector<Vec3> line = centres.corners(j);
    for (std::size_t i = 0; i <= nx; ++i) {
      const GeoPoint corner = position_of(line[i], {});
      lon[j * (nx + 1) + i] = corner.longitude.degrees();
      lat[j * (nx + 1) + i] = corner.latitude.degrees();
    }
  }
  CellCorners out;
  out.most = 4;
  out.ny = ny;
  out.nx = nx;
  out.centre_lon_deg = centre_lon_deg;
  out.centre_lat_deg = centre_lat_deg;
  for (std::size_t k = 0; k < ny * nx; ++k) {
    const std::size_t south_west = k / nx * (nx + 1) + k % nx;
    for (const std::size_t c : {south_west, south_west + 1, south_west + nx + 2, south_west + nx + 1}) {
      out.lon_deg.push_back(lon[c]);
      out.lat_deg.push_back(lat[c]);
    }
  }
  return out;
}

}  // namespace windrow::mesh
