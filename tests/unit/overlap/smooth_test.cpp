// Laws of the mass-preserving smooth map: what is restored, what stays, what becomes smooth.
#include <doctest/doctest.h>
#include <omp.h>

#include <cmath>
#include <limits>
#include <numeric>
#include <random>

#include "shapeless.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/overlap/methods.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::LinearMap;

namespace {

const double kNan = std::numeric_limits<double>::quiet_NaN();

std::vector<std::uint32_t> all_of(std::size_t count) {
  std::vector<std::uint32_t> out(count);
  std::iota(out.begin(), out.end(), 0U);
  return out;
}

// All columns of a field, by the extension.
std::vector<double> extended(const overlap::Smooth& smooth, const std::vector<double>& field) {
  const auto extender = smooth.extension->extender(all_of(smooth.map.columns));
  std::vector<double> values, out(smooth.map.columns);
  for (const std::uint32_t k : extender->needs()) values.push_back(field[k]);
  extender->extend(values, out);
  return out;
}

struct Applied {
  std::vector<double> value, cover;
};

// By the kernel, as a run does it.
Applied applied(const overlap::Smooth& smooth, const std::vector<double>& field, bool non_negative) {
  linear_map::Weights weights = linear_map::make_weights(smooth.map, {});
  if (non_negative) weights.not_below = 0;
  linear_map::SourceBlock block;
  block.resize(all_of(smooth.map.columns), smooth.map.columns, 1);
  const std::vector<double> columns = extended(smooth, field);
  block.fill(0, 1, columns.data());
  Applied out;
  for (std::size_t r = 0; r < smooth.map.rows(); ++r) {
    linear_map::RowLanes lanes;
    linear_map::apply_row(weights, r, block, 0, lanes);
    out.value.push_back(lanes.value[0]);
    out.cover.push_back(lanes.cover[0]);
  }
  return out;
}

/// Integrals over each source cell's part of the mesh against its value times that area.
struct Balance {
  std::vector<double> area, integral, terms;

  Balance(const LinearMap& plain, const std::vector<double>& mesh_value)
      : area(plain.value_columns), integral(area), terms(area) {
    for (std::size_t r = 0; r < plain.rows(); ++r) {
      for (auto p = plain.row_start[r]; p < plain.row_start[r + 1]; ++p) {
        const double part = plain.share[p] * plain.row_area[r];
        area[plain.column[p]] += part;
        integral[plain.column[p]] += part * mesh_value[r];
        terms[plain.column[p]] += part * std::abs(mesh_value[r]);
      }
    }
  }
  /// Largest relative error over the cells marked in `own`.
  [[nodiscard]] double worst(const std::vector<double>& field, const std::vector<std::uint8_t>& own) const {
    double most = 0;
    for (std::size_t k = 0; k < area.size(); ++k) {
      if (!own[k] || std::isnan(field[k])) continue;
      const double wanted = area[k] * field[k];
      if (terms[k] == 0 && wanted == 0) continue;
      most = std::max(most, std::abs(integral[k] - wanted) / std::max(terms[k], std::abs(wanted)));
    }
    return most;
  }
  [[nodiscard]] double worst_total(const std::vector<double>& field) const {
    double sum = 0, wanted = 0, size = 0;
    for (std::size_t k = 0; k < area.size(); ++k) {
      if (area[k] == 0 || std::isnan(field[k])) continue;
      sum += integral[k];
      wanted += area[k] * field[k];
      size += terms[k];
    }
    return std::abs(sum - wanted) / size;
  }
};

// Source cells that have a mesh cell to themselves, as have all that they share mesh cells with: restored one by one.
std::vector<std::uint8_t> by_itself(const LinearMap& plain, const std::vector<double>& field) {
  std::vector<std::uint8_t> own(plain.value_columns, 0);
  std::vector<std::vector<std::uint32_t>> present(plain.rows());
  for (std::size_t r = 0; r < plain.rows(); ++r) {
    for (auto p = plain.row_start[r]; p < plain.row_start[r + 1]; ++p) {
      if (!std::isnan(field[plain.column[p]])) present[r].push_back(plain.column[p]);
    }
    if (present[r].size() == 1) own[present[r][0]] = 1;
  }
  std::vector<std::uint8_t> out = own;
  for (const std::vector<std::uint32_t>& cells : present) {
    const bool all = std::all_of(cells.begin(), cells.end(), [&](std::uint32_t k) { return own[k] == 1; });
    for (const std::uint32_t k : cells) out[k] = out[k] && all ? 1 : 0;
  }
  return out;
}

struct Pair {
  mesh::MeshPtr source, target;
  LinearMap plain;
  Pair(mesh::MeshPtr s, mesh::MeshPtr t)
      : source(std::move(s)),
        target(std::move(t)),
        plain(overlap::conservative(*source, *target, linear_map::Quantity::mean).map) {}
};

Pair regional() { return {regular(-5, 30, 2.5, 2, 15, 15), azimuthal_mesh({10, 45}, 60, 60, 25e3)}; }

std::vector<double> wave(const mesh::Mesh& source) {
  std::vector<double> out;
  for (std::size_t k = 0; k < source.size(); ++k) {
    const GeoPoint c = source.centre(k);
    out.push_back(280 + 10 * std::sin(7 * c.longitude.radians()) * std::cos(9 * c.latitude.radians()));
  }
  return out;
}

}  // namespace

TEST_CASE("shares of a smooth map sum to the cover, which its geometric shares are") {
  const Pair p = regional();
  const overlap::Smooth smooth = overlap::conservative_smooth(*p.source, *p.target, false);
  CHECK(smooth.closure.holds);
  CHECK(smooth.map.value_columns == p.source->size());
  CHECK(smooth.map.columns == 2 * p.source->size());
  double worst = 0, least = 1;
  bool ascending = true;
  for (std::size_t r = 0; r < smooth.map.rows(); ++r) {
    double shares = 0, cover = 0, increments = 0, plain = 0;
    for (auto k = smooth.map.row_start[r]; k < smooth.map.row_start[r + 1]; ++k) {
      least = std::min(least, smooth.map.share[k]);
      if (k > smooth.map.row_start[r]) ascending = ascending && smooth.map.column[k - 1] < smooth.map.column[k];
      (smooth.map.column[k] < smooth.map.value_columns ? shares : increments) += smooth.map.share[k];
      cover += smooth.map.cover[k];
    }
    for (auto k = p.plain.row_start[r]; k < p.plain.row_start[r + 1]; ++k) plain += p.plain.share[k];
    worst = std::max({worst, std::abs(shares - plain), std::abs(cover - plain), std::abs(increments - plain)});
  }
  CHECK(worst < 1e-14);
  CHECK(least > 0);
  CHECK(ascending);
}

TEST_CASE("every source cell's integral is restored, on a smooth field and on noise, with random cells missing too") {
  std::mt19937_64 random(20260302);
  std::normal_distribution<double> normal;
  std::uniform_real_distribution<double> uniform;
  for (const Pair& p : {regional(), Pair(regular(0, -90, 10, 10, 18, 36), regular(0.3, -90, 2.4, 1.5, 120, 150))}) {
    CAPTURE(p.target->describe());
    const overlap::Smooth smooth = overlap::conservative_smooth(*p.source, *p.target, false);
    for (const double missing : {0.0, 0.1, 0.5}) {
      for (const bool rough : {false, true}) {
        std::vector<double> field = wave(*p.source);
        for (double& f : field) {
          if (rough) f = normal(random);
          if (uniform(random) < missing) f = kNan;
        }
        Applied result = applied(smooth, field, false);
        for (std::size_t r = 0; r < result.value.size(); ++r) {
          if (std::isnan(result.value[r])) result.value[r] = 0;
        }
        const Balance balance(p.plain, result.value);
        const std::vector<std::uint8_t> own = by_itself(p.plain, field);
        CHECK(std::count(own.begin(), own.end(), 1) > 15);
        CHECK(balance.worst(field, own) < 1e-12);
        CHECK(balance.worst_total(field) < 1e-13);
      }
    }
  }
}

TEST_CASE("constants stay constant, with random cells missing too") {
  std::mt19937_64 random(5);
  std::uniform_real_distribution<double> uniform;
  const Pair p = regional();
  const overlap::Smooth smooth = overlap::conservative_smooth(*p.source, *p.target, false);
  for (const double missing : {0.0, 0.3}) {
    std::vector<double> field(p.source->size(), 287.65);
    for (double& f : field) f = uniform(random) < missing ? kNan : f;
    double worst = 0;
    for (const double v : applied(smooth, field, false).value) {
      if (!std::isnan(v)) worst = std::max(worst, std::abs(v / 287.65 - 1));
    }
    CHECK(worst < 1e-13);
  }
}

TEST_CASE("non-negative fields stay so, keep their zeros, and their integrals are restored") {
  std::mt19937_64 random(99);
  std::normal_distribution<double> normal;
  std::uniform_real_distribution<double> uniform;
  const Pair p = regional();
  const overlap::Smooth smooth = overlap::conservative_smooth(*p.source, *p.target, true);
  const overlap::Smooth plain = overlap::conservative_smooth(*p.source, *p.target, false);
  double below = 0;
  for (int trial = 0; trial < 12; ++trial) {
    std::vector<double> field;
    for (std::size_t k = 0; k < p.source->size(); ++k) {
      const double x = normal(random);
      field.push_back(uniform(random) < 0.05 * (trial % 3) ? kNan : (x > -0.5 + 0.15 * trial ? std::exp(3 * x) : 0.0));
    }
    const std::vector<std::uint8_t> own = by_itself(p.plain, field);
    Applied result = applied(smooth, field, true);
    double least = 0, silent = 0;
    for (std::size_t r = 0; r < result.value.size(); ++r) {
      if (std::isnan(result.value[r])) result.value[r] = 0;
      least = std::min(least, result.value[r]);
      for (auto k = p.plain.row_start[r]; k < p.plain.row_start[r + 1]; ++k) {
        const std::uint32_t cell = p.plain.column[k];
        if (field[cell] == 0 && own[cell]) silent = std::max(silent, result.value[r]);
      }
    }
    CHECK(least == 0);
    CHECK(silent == 0);
    const Balance balance(p.plain, result.value);
    CHECK(balance.worst(field, own) < 1e-10);
    CHECK(balance.worst_total(field) < 1e-12);
    for (const double v : applied(plain, field, false).value) below = std::min(below, v);
  }
  CHECK(below < -0.1);  // the condition had something to do
}

TEST_CASE("a field far above zero is the same with and without the condition") {
  const Pair p = regional();
  const std::vector<double> field = wave(*p.source);
  const std::vector<double> a = extended(overlap::conservative_smooth(*p.source, *p.target, true), field);
  const std::vector<double> b = extended(overlap::conservative_smooth(*p.source, *p.target, false), field);
  double worst = 0;
  for (std::size_t k = 0; k < a.size(); ++k) worst = std::max(worst, std::abs(a[k] - b[k]));
  CHECK(worst < 1e-9);
}

TEST_CASE("at least 60 % of the variance of jumps between source cells is gone on a smooth field") {
  for (const double size : {10e3, 25e3, 40e3}) {
    CAPTURE(size);
    const auto cells = static_cast<std::size_t>(1500e3 / size);
    const Pair p(regular(-20, 20, 1.25, 1.25, 40, 50), azimuthal_mesh({10, 45}, cells, cells, size));
    const std::vector<double> field = wave(*p.source);
    const Applied smooth = applied(overlap::conservative_smooth(*p.source, *p.target, false), field, false);
    std::vector<double> stepped(p.plain.rows(), 0.0);
    std::vector<std::uint32_t> main(p.plain.rows());
    for (std::size_t r = 0; r < p.plain.rows(); ++r) {
      double largest = 0;
      for (auto k = p.plain.row_start[r]; k < p.plain.row_start[r + 1]; ++k) {
        stepped[r] += p.plain.share[k] * field[p.plain.column[k]];
        if (p.plain.share[k] <= largest) continue;
        largest = p.plain.share[k];
        main[r] = p.plain.column[k];
      }
    }
    double before = 0, after = 0;
    const auto compare = [&](std::size_t a, std::size_t b) {
      if (main[a] == main[b]) return;
      before += (stepped[a] - stepped[b]) * (stepped[a] - stepped[b]);
      after += (smooth.value[a] - smooth.value[b]) * (smooth.value[a] - smooth.value[b]);
    };
    for (std::size_t j = 0; j < cells; ++j) {
      for (std::size_t i = 0; i < cells; ++i) {
        if (i + 1 < cells) compare(j * cells + i, j * cells + i + 1);
        if (j + 1 < cells) compare(j * cells + i, (j + 1) * cells + i);
      }
    }
    CHECK(before > 0);
    CHECK(after < 0.4 * before);
  }
}

TEST_CASE("maps and multipliers are the same bits for any number of threads, columns asked, or steps before") {
  const Pair p = regional();
  const int threads = omp_get_max_threads();
  omp_set_num_threads(1);
  const overlap::Smooth one = overlap::conservative_smooth(*p.source, *p.target, true);
  omp_set_num_threads(3);
  const overlap::Smooth three = overlap::conservative_smooth(*p.source, *p.target, true);
  omp_set_num_threads(threads);
  CHECK(one.map == three.map);
  std::vector<double> field = wave(*p.source), other = field;
  for (std::size_t k = 0; k < field.size(); ++k) field[k] = std::max(0.0, field[k] - 280);
  other[100] = kNan;
  const std::vector<double> expected = extended(one, field);
  const std::size_t n = p.source->size();
  const std::vector<std::uint32_t> some{7, 101, static_cast<std::uint32_t>(n + 99),
                                        static_cast<std::uint32_t>(n + 130)};
  const auto extender = overlap::make_multipliers(three.map, true)->extender(some);
  for (const std::vector<double>& step : {field, other, field}) {
    std::vector<double> values, out(some.size());
    for (const std::uint32_t k : extender->needs()) values.push_back(step[k]);
    extender->extend(values, out);
    if (step[100] != field[100]) continue;
    for (std::size_t k = 0; k < some.size(); ++k) CHECK(out[k] == expected[some[k]]);
  }
  // Values alone need no other cells.
  CHECK(one.extension->extender({3, 8})->needs() == std::vector<std::uint32_t>{3, 8});
}

TEST_CASE("a mesh coarser than the source is left as it is, its total restored") {
  const Pair p(regular(0, 30, 0.5, 0.5, 40, 40), azimuthal_mesh({10, 40}, 8, 8, 150e3));
  const std::vector<double> field = wave(*p.source);
  const Applied result = applied(overlap::conservative_smooth(*p.source, *p.target, false), field, false);
  CHECK(Balance(p.plain, result.value).worst_total(field) < 1e-13);
}
