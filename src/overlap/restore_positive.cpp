// Restoring integrals while no mesh value may be negative.
#include <algorithm>
#include <cmath>

#include "restore.h"

namespace windrow::overlap {

// With F = max(0, smooth + sum share * multiplier) the multipliers that restore all integrals minimise the convex
// function
//   1/2 sum_i A_i F_i^2 - sum_g wanted_g multiplier_g,
// whose gradient is the residual: the dual of the least change under F >= 0. Newton's method on it takes the mesh cells
// that are above zero for fixed in one step (semismooth: Qi & Sun 1993, Math. Program. 58, 353) and ends after finitely
// many, since the function is made of finitely many quadratic pieces.

NonNegative::NonNegative(const SmoothSystem& system, const Equations& equations,
                         const std::vector<std::uint8_t>& missing)
    : system_(system), equations_(equations), missing_(missing), active_(equations.matrix()) {
  part_start_.push_back(0);
  for (std::size_t row = 0; row + 1 < system.overlap_start.size(); ++row) {
    const auto first = static_cast<std::ptrdiff_t>(part_.size());
    for (auto p = system.overlap_start[row]; p < system.overlap_start[row + 1]; ++p) {
      const std::uint32_t cell = system.overlap_column[p];
      if (missing[cell]) continue;
      const std::uint32_t group = equations.group()[cell];
      const auto same =
          std::find_if(part_.begin() + first, part_.end(), [&](const Part& q) { return q.group == group; });
      if (same != part_.end()) {
        same->share += system.overlap[p];
        same->area += system.overlap[p] * system.row_area[row];
      } else {
        part_.push_back({group, system.overlap[p], system.overlap[p] * system.row_area[row]});
      }
    }
    if (static_cast<std::size_t>(first) == part_.size()) continue;
    row_.push_back(static_cast<std::uint32_t>(row));
    part_start_.push_back(part_.size());
  }
  smooth_.resize(row_.size());
  silent_row_.resize(row_.size());
}

void NonNegative::smooth(std::span<const double> value) {
  for (std::size_t k = 0; k < row_.size(); ++k) {
    double sum = 0, present = 0;
    for (auto w = system_.weight_start[row_[k]]; w < system_.weight_start[row_[k] + 1]; ++w) {
      const double x = value[system_.weight_column[w]];
      if (x != x) continue;
      sum += system_.weight[w] * x;
      present += system_.weight[w];
    }
    smooth_[k] = sum / present;
  }
}

// The function's value; leaves the residual in off_, and the matrix of the mesh cells above zero where asked.
double NonNegative::evaluate(const std::vector<double>& multiplier, bool with_matrix) {
  off_ = wanted_;
  if (with_matrix) std::fill(active_.value.begin(), active_.value.end(), 0.0);
  double squares = 0;
  for (std::size_t k = 0; k < row_.size(); ++k) {
    if (silent_row_[k]) continue;
    const auto first = part_start_[k], last = part_start_[k + 1];
    double f = smooth_[k];
    for (auto p = first; p < last; ++p) f += part_[p].share * multiplier[part_[p].group];
    if (!(f > 0)) continue;
    squares += system_.row_area[row_[k]] * f * f;
    for (auto p = first; p < last; ++p) off_[part_[p].group] -= part_[p].area * f;
    if (!with_matrix) continue;
    if (last - first == 1) {
      active_.value[active_.diagonal[part_[first].group]] += part_[first].area * part_[first].share;
      continue;
    }
    for (auto a = first; a < last; ++a) {
      for (auto b = first; b < last; ++b) {
        active_.value[active_.place(part_[a].group, part_[b].group)] += part_[a].area * part_[b].share;
      }
    }
  }
  double wanted = 0;
  for (std::size_t g = 0; g < wanted_.size(); ++g) wanted += wanted_[g] * multiplier[g];
  return 0.5 * squares - wanted;
}

bool NonNegative::restore(std::span<const double> value, std::vector<double>& multiplier) {
  smooth(value);
  const SymmetricMatrix& whole = equations_.matrix();
  const std::size_t groups = equations_.groups();
  wanted_.assign(groups, 0.0);
  for (std::size_t k = 0; k < system_.cells; ++k) {
    if (equations_.group()[k] != Equations::kNone) wanted_[equations_.group()[k]] += system_.area[k] * value[k];
  }
  silent_group_.assign(groups, 0);
  for (std::size_t g = 0; g < groups; ++g) {
    silent_group_[g] = wanted_[g] > 0 ? 0 : 1;
    if (silent_group_[g]) wanted_[g] = 0;
  }
  for (std::size_t k = 0; k < row_.size(); ++k) {
    silent_row_[k] = 0;
    for (auto p = part_start_[k]; p < part_start_[k + 1]; ++p) {
      if (silent_group_[part_[p].group]) silent_row_[k] = 1;
    }
  }
  std::vector<double> tolerance, step, trial(groups);
  equations_.residual(value, off_, tolerance);
  to_tolerance(whole, value, tolerance);
  multiplier.assign(groups, 0.0);
  double now = evaluate(multiplier, true);
  constexpr int kMost = 200;
  bool done = within(off_, tolerance);
  for (int k = 0; k < kMost && !done; ++k) {
    for (std::size_t g = 0; g < groups; ++g) {
      // A group with hardly a mesh cell above zero takes a step scaled by all of them instead.
      double& own = active_.value[active_.diagonal[g]];
      own += (own > 1e-6 * whole.diagonal_of(g) ? 1e-12 : 1.0) * whole.diagonal_of(g);
    }
    solve(active_, off_, tolerance, step);
    double slope = 0;
    for (std::size_t g = 0; g < groups; ++g) slope += off_[g] * step[g];
    double part = 1;
    for (int halving = 0;; ++halving, part *= 0.5) {
      for (std::size_t g = 0; g < groups; ++g) trial[g] = multiplier[g] + part * step[g];
      const double there = evaluate(trial, true);
      if (there <= now - 1e-4 * part * slope + 1e-13 * std::abs(now) || halving == 40) {
        now = there;
        break;
      }
    }
    multiplier = trial;
    done = within(off_, tolerance);
  }
  silence(multiplier);
  return done;
}

// Multipliers of groups that are to be zero: low enough that no mesh cell they reach is above zero. Each such mesh cell
// is left to the silent group that has most of it.
void NonNegative::silence(std::vector<double>& multiplier) const {
  constexpr double kSafely = 1 + 1e-9;
  std::vector<double> lowest(multiplier.size(), 0.0);
  for (std::size_t k = 0; k < row_.size(); ++k) {
    if (!silent_row_[k]) continue;
    double above = std::max(0.0, smooth_[k]);
    const Part* most = nullptr;
    for (auto p = part_start_[k]; p < part_start_[k + 1]; ++p) {
      const Part& part = part_[p];
      if (!silent_group_[part.group]) {
        above += std::max(0.0, part.share * multiplier[part.group]);
      } else if (most == nullptr || part.share > most->share) {
        most = &part;
      }
    }
    lowest[most->group] = std::min(lowest[most->group], -kSafely * above / most->share);
  }
  for (std::size_t g = 0; g < multiplier.size(); ++g) {
    if (silent_group_[g]) multiplier[g] = lowest[g];
  }
}

}  // namespace windrow::overlap
