// Groups, matrices and the plain solution. Non-negative fields are in restore_positive.cpp.
#include "restore.h"

#include <algorithm>
#include <cmath>
#include <numeric>

namespace windrow::overlap {
namespace {

// Sets that grow together; the lowest member names a set.
class Sets {
 public:
  explicit Sets(std::size_t count) : parent_(count) { std::iota(parent_.begin(), parent_.end(), 0U); }
  std::uint32_t of(std::uint32_t k) {
    while (parent_[k] != k) k = parent_[k] = parent_[parent_[k]];
    return k;
  }
  void join(std::uint32_t a, std::uint32_t b) {
    a = of(a);
    b = of(b);
    parent_[std::max(a, b)] = std::min(a, b);
  }

 private:
  std::vector<std::uint32_t> parent_;
};

}  // namespace

SmoothSystem::SmoothSystem(const linear_map::LinearMap& map) : cells(map.value_columns), row_area(map.row_area) {
  weight_start.push_back(0);
  overlap_start.push_back(0);
  area.assign(cells, 0.0);
  std::vector<std::uint8_t> seen(cells, 0);
  std::vector<MatrixEntry> entries;
  std::vector<std::uint64_t> own(cells, 0);  // place of a cell's diagonal entry: most mesh cells have one overlap
  for (std::size_t row = 0; row < map.rows(); ++row) {
    for (auto p = map.row_start[row]; p < map.row_start[row + 1] && map.column[p] < cells; ++p) {
      const std::uint32_t cell = map.column[p];
      seen[cell] = 1;
      weight_column.push_back(cell);
      weight.push_back(map.share[p]);
      if (!(map.cover[p] > 0)) continue;
      overlap_column.push_back(cell);
      overlap.push_back(map.cover[p]);
      area[cell] += map.cover[p] * row_area[row];
    }
    weight_start.push_back(weight.size());
    for (auto a = overlap_start.back(); a < overlap.size(); ++a) {
      for (auto b = overlap_start.back(); b < overlap.size(); ++b) {
        const std::uint32_t row_cell = overlap_column[a], column_cell = overlap_column[b];
        const double value = overlap[a] * overlap[b] * row_area[row];
        if (a == b && own[row_cell] > 0) {
          entries[own[row_cell] - 1].value += value;
          continue;
        }
        entries.push_back({row_cell, column_cell, value});
        if (a == b) own[row_cell] = entries.size();
      }
    }
    overlap_start.push_back(overlap.size());
  }
  shared = make_matrix(cells, std::move(entries));
  for (std::uint32_t k = 0; k < cells; ++k) {
    if (seen[k]) used.push_back(k);
  }
}

Equations::Equations(const SmoothSystem& system, const std::vector<std::uint8_t>& missing) : system_(system) {
  make_groups(missing);
  mix(missing);
}

void Equations::make_groups(const std::vector<std::uint8_t>& missing) {
  const SmoothSystem& s = system_;
  const auto takes_part = [&](std::uint32_t cell) { return !missing[cell] && s.area[cell] > 0; };
  Sets sets(s.cells);
  std::vector<std::uint8_t> has_own(s.cells);
  for (bool all = false; !all;) {
    std::fill(has_own.begin(), has_own.end(), 0);
    for (std::size_t row = 0; row + 1 < s.overlap_start.size(); ++row) {
      std::uint32_t only = kNone;
      bool one = true;
      for (auto p = s.overlap_start[row]; p < s.overlap_start[row + 1]; ++p) {
        if (missing[s.overlap_column[p]]) continue;
        const std::uint32_t set = sets.of(s.overlap_column[p]);
        one = one && (only == kNone || only == set);
        only = set;
      }
      if (only != kNone && one) has_own[only] = 1;
    }
    all = true;
    std::vector<std::vector<std::uint32_t>> members(s.cells);
    for (std::uint32_t k = 0; k < s.cells; ++k) {
      if (takes_part(k) && !has_own[sets.of(k)]) members[sets.of(k)].push_back(k);
    }
    for (std::uint32_t set = 0; set < s.cells; ++set) {
      std::vector<Mixed> with;  // what the set shares with others, by the others' sets
      for (const std::uint32_t k : members[set]) {
        for (auto p = s.shared.start[k]; p < s.shared.start[k + 1]; ++p) {
          const std::uint32_t other = s.shared.column[p];
          if (!takes_part(other) || sets.of(other) == sets.of(set)) continue;
          const auto same =
              std::find_if(with.begin(), with.end(), [&](const Mixed& m) { return m.cell == sets.of(other); });
          if (same != with.end()) {
            same->area += s.shared.value[p];
          } else {
            with.push_back({sets.of(other), s.shared.value[p]});
          }
        }
      }
      if (with.empty()) continue;
      const auto most =
          std::max_element(with.begin(), with.end(), [](const Mixed& a, const Mixed& b) { return a.area < b.area; });
      sets.join(set, most->cell);
      all = false;
    }
  }
  group_.assign(s.cells, kNone);
  std::uint32_t count = 0;
  for (std::uint32_t k = 0; k < s.cells; ++k) {
    if (takes_part(k)) group_[k] = sets.of(k) == k ? count++ : group_[sets.of(k)];
  }
  std::vector<MatrixEntry> entries;
  for (std::uint32_t k = 0; k < s.cells; ++k) {
    if (group_[k] == kNone) continue;
    for (auto p = s.shared.start[k]; p < s.shared.start[k + 1]; ++p) {
      const std::uint32_t other = group_[s.shared.column[p]];
      if (other != kNone) entries.push_back({group_[k], other, s.shared.value[p]});
    }
  }
  matrix_ = make_matrix(count, std::move(entries));
}

// What the smooth mesh values, renormalised by the weights that are present, hold of each source cell's integral.
void Equations::mix(const std::vector<std::uint8_t>& missing) {
  const SmoothSystem& s = system_;
  std::vector<std::vector<Mixed>> of(s.cells);
  for (std::size_t row = 0; row + 1 < s.overlap_start.size(); ++row) {
    double present = 0;
    for (auto w = s.weight_start[row]; w < s.weight_start[row + 1]; ++w) {
      if (!missing[s.weight_column[w]]) present += s.weight[w];
    }
    for (auto p = s.overlap_start[row]; p < s.overlap_start[row + 1]; ++p) {
      const std::uint32_t cell = s.overlap_column[p];
      if (missing[cell]) continue;
      const double part = s.overlap[p] * s.row_area[row] / present;
      std::vector<Mixed>& mixed = of[cell];
      std::size_t at = 0;  // both lists ascend: the search goes on where it was
      for (auto w = s.weight_start[row]; w < s.weight_start[row + 1]; ++w) {
        const std::uint32_t other = s.weight_column[w];
        if (other == cell || missing[other]) continue;
        while (at < mixed.size() && mixed[at].cell < other) ++at;
        if (at == mixed.size() || mixed[at].cell != other) {
          mixed.insert(mixed.begin() + static_cast<std::ptrdiff_t>(at), {other, 0.0});
        }
        mixed[at].area += part * s.weight[w];
      }
    }
  }
  mixed_start_.assign(1, 0);
  for (const std::vector<Mixed>& mixed : of) {
    mixed_.insert(mixed_.end(), mixed.begin(), mixed.end());
    mixed_start_.push_back(mixed_.size());
  }
}

// A sum of differences: where neighbours are equal nothing is off, to the bit.
void Equations::residual(std::span<const double> value, std::vector<double>& off, std::vector<double>& size) const {
  off.assign(groups(), 0.0);
  size.assign(groups(), 0.0);
  for (std::size_t k = 0; k < group_.size(); ++k) {
    if (group_[k] == kNone) continue;
    double sum = 0, terms = system_.area[k] * std::abs(value[k]);
    for (auto p = mixed_start_[k]; p < mixed_start_[k + 1]; ++p) {
      const double there = value[mixed_[p].cell];
      sum += mixed_[p].area * (value[k] - there);
      terms += mixed_[p].area * std::abs(there);
    }
    off[group_[k]] += sum;
    size[group_[k]] += terms;
  }
}

void to_tolerance(const SymmetricMatrix& matrix, std::span<const double> value, std::vector<double>& size) {
  double largest = 0;
  for (const double v : value) largest = v == v ? std::max(largest, std::abs(v)) : largest;
  for (std::size_t g = 0; g < size.size(); ++g) {
    size[g] = kRestored * size[g] + kRestoredOfField * largest * matrix.diagonal_of(g);
  }
}

bool restore(const Equations& equations, std::span<const double> value, std::vector<double>& multiplier) {
  std::vector<double> off, size;
  equations.residual(value, off, size);
  to_tolerance(equations.matrix(), value, size);
  return solve(equations.matrix(), off, size, multiplier);
}

}  // namespace windrow::overlap
