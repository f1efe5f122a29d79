// Each source cell's part in the mesh is smoothed by itself, on the patch of mesh cells that it can reach.
#include "sweeps.h"

#include <algorithm>
#include <cmath>

#include "centres.h"
#include "contacts.h"

namespace windrow::overlap {
namespace {

using linear_map::LinearMap;

constexpr double kSmallest = 1e-4;  // weights left out
constexpr std::uint32_t kNowhere = 0xffffffffU;

// Standard deviation that sweeps give a point along one axis, as a part of a source cell's side. Measured with 1.25
// degree cells at 48 degrees north: on a smooth field the jumps between source cells lose, integrals restored, 86 % of
// their variance where a source cell has 22 mesh cells a side, 84 % with 4.5, 77 % with 3.8 and 65 % with 2.8; wider
// sweeps leave restoring more to do. A step's fundamental wave keeps exp(-2 pi^2 0.3^2) = 17 % of its amplitude, and a
// map holds about nine source cells a row. On noise from cell to cell restoring brings back what sweeps take: half the
// variance stays with 22 mesh cells a side, all of it with 4.5.
constexpr double kWidth = 0.3;
constexpr double kFewest = 2;

// Median of squared mean steps along one axis and of source cells' areas, both in mesh cells.
struct Scales {
  double step2 = 0.4;
  double source_area = 1;
};

std::size_t sweeps_for(const Scales& scale) {
  if (scale.source_area < 1) return 0;
  return static_cast<std::size_t>(std::max(kFewest, std::round(kWidth * kWidth * scale.source_area / scale.step2)));
}

double median(std::vector<double>& values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

Scales scales(const LinearMap& map, const mesh::Mesh& target, const Neighbours& near) {
  constexpr std::size_t kSamples = 1000;
  std::vector<double> steps, areas;
  const mesh::Earth earth = target.earth();
  const std::size_t stride = std::max<std::size_t>(1, map.rows() / kSamples);
  for (std::size_t row = 0; row < map.rows(); row += stride) {
    if (map.row_start[row] == map.row_start[row + 1]) continue;
    const auto first = map.share.begin() + static_cast<std::ptrdiff_t>(map.row_start[row]);
    const auto last = map.share.begin() + static_cast<std::ptrdiff_t>(map.row_start[row + 1]);
    const auto largest = static_cast<std::size_t>(std::max_element(first, last) - map.share.begin());
    areas.push_back(map.column_area[map.column[largest]] / map.row_area[row]);
    const sphere::Vec3 here = on_sphere(target.centre(row), earth);
    double sum = 0;
    for (auto n = near.start[row]; n < near.start[row + 1]; ++n) {
      const sphere::Vec3 off = on_sphere(target.centre(near.cell[n]), earth) - here;
      sum += dot(off, off);
    }
    const auto count = static_cast<double>(near.start[row + 1] - near.start[row] + 1);
    if (sum > 0) steps.push_back(sum / count / 2 / map.row_area[row]);
  }
  Scales out;
  if (!areas.empty()) out.source_area = median(areas);
  if (!steps.empty()) out.step2 = median(steps);
  return out;
}

// x^K as a sum of Chebyshev polynomials: 2^(1-K) binomial(K, (K - m) / 2) T_m(x), m = K, K - 2, ... (the term of m = 0
// halved). Terms beyond m of about sqrt(2 K ln(1 / eps)) are below eps: so many products with the matrix of means,
// whose eigenvalues lie in -1..1, do for K sweeps. Coefficients add up to 1, so that means are kept.
std::vector<double> power_series(std::size_t sweeps) {
  constexpr double kEnough = 1e-6;
  std::vector<double> series(sweeps + 1, 0.0);
  const double k = static_cast<double>(sweeps);
  double term = 1, sum = 0;
  std::size_t used = 0;
  for (std::size_t m = sweeps % 2; m <= sweeps; m += 2) {
    series[m] = m == 0 ? 0.5 * term : term;
    sum += series[m];
    used = m + 1;
    if (series[m] < kEnough * sum) break;
    const double taken = 0.5 * (k - static_cast<double>(m));
    term *= taken / (k - taken + 1);
  }
  series.resize(used);
  for (double& c : series) c /= sum;
  return series;
}

struct Entry {
  std::uint32_t row;
  double share;
};

// Works on one source cell after another; one a thread.
class Patch {
 public:
  Patch(const Neighbours& near, const std::vector<std::uint8_t>& covered, const std::vector<double>& series,
        std::size_t layers)
      : near_(near), covered_(covered), series_(series), layers_(layers), place_(covered.size(), kNowhere) {}

  // `own`: the source cell's normalised shares. Rows ascending.
  std::vector<Entry> smooth(const std::vector<Entry>& own) {
    gather(own);
    const std::size_t cells = cells_.size();
    before_.assign(cells, 0);
    for (const Entry& e : own) before_[place_[e.row]] = e.share;
    sum_.resize(cells);
    for (std::size_t k = 0; k < cells; ++k) sum_[k] = series_[0] * before_[k];
    if (series_.size() > 1) {
      now_.resize(cells);
      next_.resize(cells);
      step(1, 0, series_[1], before_, before_, now_);
      for (std::size_t m = 2; m < series_.size(); ++m) {  // T_m = 2 x T_(m-1) - T_(m-2)
        step(2, 1, series_[m], now_, before_, next_);
        std::swap(before_, now_);
        std::swap(now_, next_);
      }
    }
    std::vector<Entry> out;
    auto next_own = own.begin();
    for (std::size_t k = 0; k < cells; ++k) {
      place_[cells_[k]] = kNowhere;
      const bool overlaps = next_own != own.end() && next_own->row == cells_[k];
      if (overlaps) ++next_own;
      // Overlaps always keep some weight: where all else is missing they are the value.
      if (sum_[k] >= kSmallest || overlaps) out.push_back({cells_[k], std::max(1e-3 * kSmallest, sum_[k])});
    }
    return out;
  }

 private:
  // Covered cells within `layers_` steps of the source cell's own, and their neighbours' places; beyond, values are
  // zero.
  void gather(const std::vector<Entry>& own) {
    cells_.clear();
    for (const Entry& e : own) {
      place_[e.row] = static_cast<std::uint32_t>(cells_.size());
      cells_.push_back(e.row);
    }
    std::size_t first = 0;
    for (std::size_t layer = 0; layer < layers_; ++layer) {
      const std::size_t last = cells_.size();
      for (; first < last; ++first) {
        for (auto n = near_.start[cells_[first]]; n < near_.start[cells_[first] + 1]; ++n) {
          const std::uint32_t cell = near_.cell[n];
          if (!covered_[cell] || place_[cell] != kNowhere) continue;
          place_[cell] = static_cast<std::uint32_t>(cells_.size());
          cells_.push_back(cell);
        }
      }
    }
    std::sort(cells_.begin(), cells_.end());
    for (std::size_t k = 0; k < cells_.size(); ++k) place_[cells_[k]] = static_cast<std::uint32_t>(k);
    start_.assign(1, 0);
    link_.clear();
    part_.clear();
    for (const std::uint32_t cell : cells_) {
      std::size_t count = 1;
      for (auto n = near_.start[cell]; n < near_.start[cell + 1]; ++n) {
        if (!covered_[near_.cell[n]]) continue;
        ++count;
        if (place_[near_.cell[n]] != kNowhere) link_.push_back(place_[near_.cell[n]]);
      }
      start_.push_back(static_cast<std::uint32_t>(link_.size()));
      part_.push_back(1.0 / static_cast<double>(count));
    }
  }
  // next = factor * means of `now` - less * `before`, and adds coefficient * next to the sum.
  void step(double factor, double less, double coefficient, const std::vector<double>& now,
            const std::vector<double>& before, std::vector<double>& next) {
    for (std::size_t k = 0; k < cells_.size(); ++k) {
      double sum = now[k];
      for (std::uint32_t n = start_[k]; n < start_[k + 1]; ++n) sum += now[link_[n]];
      const double value = factor * part_[k] * sum - less * before[k];
      next[k] = value;
      sum_[k] += coefficient * value;
    }
  }

  const Neighbours& near_;
  const std::vector<std::uint8_t>& covered_;
  const std::vector<double>& series_;
  std::size_t layers_;
  std::vector<std::uint32_t> place_, cells_, start_, link_;
  std::vector<double> part_, before_, now_, next_, sum_;
};

// Rows of what the source cells hold, each made to sum to 1.
SmoothShares by_rows(std::vector<std::vector<Entry>>& columns, std::size_t rows) {
  SmoothShares out;
  out.start.assign(rows + 1, 0);
  for (const auto& column : columns) {
    for (const Entry& e : column) ++out.start[e.row + 1];
  }
  for (std::size_t r = 0; r < rows; ++r) out.start[r + 1] += out.start[r];
  out.column.resize(out.start.back());
  out.share.resize(out.start.back());
  std::vector<std::uint64_t> next(out.start.begin(), out.start.end() - 1);
  for (std::size_t c = 0; c < columns.size(); ++c) {
    for (const Entry& e : columns[c]) {
      const std::uint64_t p = next[e.row]++;
      out.column[p] = static_cast<std::uint32_t>(c);
      out.share[p] = e.share;
    }
    columns[c] = {};
  }
  for (std::size_t r = 0; r < rows; ++r) {
    double sum = 0;
    for (auto p = out.start[r]; p < out.start[r + 1]; ++p) sum += out.share[p];
    for (auto p = out.start[r]; p < out.start[r + 1]; ++p) out.share[p] /= sum;
  }
  return out;
}

}  // namespace

SmoothShares smoothed_shares(const LinearMap& map, const mesh::Mesh& target) {
  const Neighbours near = side_neighbours(target);
  const Scales scale = scales(map, target, near);
  const std::size_t sweeps = sweeps_for(scale);
  std::vector<std::vector<Entry>> own(map.value_columns);
  std::vector<std::uint8_t> covered(map.rows(), 0);
  for (std::size_t row = 0; row < map.rows(); ++row) {
    double cover = 0;
    for (auto p = map.row_start[row]; p < map.row_start[row + 1]; ++p) cover += map.share[p];
    covered[row] = cover > 0;
    for (auto p = map.row_start[row]; p < map.row_start[row + 1]; ++p) {
      own[map.column[p]].push_back({static_cast<std::uint32_t>(row), map.share[p] / cover});
    }
  }
  // Weights at a corner of a source cell fall below 3e-4 within 4.2 standard deviations, counted in steps along both
  // axes; along one axis they fall below kSmallest within 3.8.
  const double deviation = std::sqrt(scale.step2 * static_cast<double>(sweeps));
  const auto layers = std::min(sweeps, static_cast<std::size_t>(std::ceil(4.2 * deviation)) + 1);
  const std::vector<double> series = power_series(sweeps);
  std::vector<std::vector<Entry>> smooth(own.size());
#pragma omp parallel
  {
    Patch patch(near, covered, series, layers);
#pragma omp for schedule(dynamic)
    for (std::size_t c = 0; c < own.size(); ++c) {
      if (!own[c].empty()) smooth[c] = patch.smooth(own[c]);
    }
  }
  SmoothShares out = by_rows(smooth, map.rows());
  out.sweeps = sweeps;
  return out;
}

}  // namespace windrow::overlap
