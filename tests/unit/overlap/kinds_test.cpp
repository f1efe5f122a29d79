// Every kind of grid onto every kind of mesh: sums, constants and integrals hold.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <limits>
#include <numeric>

#include "kinds.h"
#include "windrow/base/exact_sum.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/overlap/methods.h"
#include "windrow/sphere/area.h"

using namespace windrow;
using namespace windrow::test;
using linear_map::LinearMap;
using linear_map::Quantity;

namespace {

constexpr double kConstant = 1e-14, kIntegral = 1e-13;  // relative

double relative(double a, double b) { return std::abs(a / b - 1); }

// Largest residual of sums over rows and columns, in units of their bounds. Where cells reach beyond the other mesh, a
// sum may only fall short of the cell's area.
double sums_ratio(const LinearMap& map, const Kind& source, const Kind& target) {
  double worst = 0;
  for (std::size_t row = 0; row < map.rows(); ++row) {
    double sum = 0;
    for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
      if (map.column[k] < map.value_columns) sum += map.share[k];
    }
    const double off = source.global ? std::abs(sum - 1) : sum - 1;
    worst = std::max(worst, off / target.bound[row]);
  }
  const std::vector<double> overlap = linear_map::column_overlap(map);
  for (std::size_t c = 0; c < map.value_columns && !target.mesh->cells_may_overlap(); ++c) {
    const double excess = overlap[c] / source.mesh->area(c) - 1;
    worst = std::max(worst, (target.global ? std::abs(excess) : excess) / source.bound[c]);
  }
  return worst;
}

// Values times covered areas of all rows, as the kernel gives them; `columns` are one a map column.
struct Applied {
  double integral = 0, lowest = std::numeric_limits<double>::infinity(), highest = -lowest;
};
Applied carried(const LinearMap& map, const std::vector<double>& columns) {
  const linear_map::Weights weights = linear_map::make_weights(map, {});
  linear_map::SourceBlock block;
  std::vector<std::uint32_t> all(map.columns);
  std::iota(all.begin(), all.end(), 0U);
  block.resize(all, map.columns, 1);
  block.fill(0, 1, columns.data());
  Applied out;
  ExactSum sum;
  linear_map::RowLanes lanes;
  for (std::size_t row = 0; row < map.rows(); ++row) {
    linear_map::apply_row(weights, row, block, 0, lanes);
    if (std::isnan(lanes.value[0])) continue;
    sum.add(lanes.value[0] * lanes.weight[0] * map.row_area[row]);
    out.lowest = std::min(out.lowest, lanes.value[0]);
    out.highest = std::max(out.highest, lanes.value[0]);
  }
  out.integral = sum.value();
  return out;
}

// Integral of the source over what the mesh covers; cells wholly covered count with their own area, whatever the map
// says.
double source_integral(const LinearMap& map, const Kind& source, const std::vector<double>& field) {
  const std::vector<double> overlap = linear_map::column_overlap(map);
  ExactSum sum;
  for (std::size_t c = 0; c < source.mesh->size(); ++c) {
    if (std::isnan(field[c])) continue;
    const bool whole = std::abs(overlap[c] / source.mesh->area(c) - 1) <= source.bound[c];
    sum.add(field[c] * (whole ? source.mesh->area(c) : overlap[c]));
  }
  return sum.value();
}

// Positive, with 30 % missing where asked.
std::vector<double> random_field(std::size_t size, double missing) {
  std::mt19937_64 random(20260304);
  std::uniform_real_distribution<double> uniform;
  std::vector<double> out;
  for (std::size_t k = 0; k < size; ++k) {
    const double value = std::exp(3 * uniform(random));
    out.push_back(uniform(random) < missing ? std::nan("") : value);
  }
  return out;
}

using Table = std::vector<std::vector<double>>;
std::string shown(const std::string& title, const Table& table, const std::vector<Kind>& sources,
                  const std::vector<Kind>& targets, double unit) {
  std::string out = title + "\n" + fmt::format("{:10}", "");
  for (const Kind& target : targets) out += fmt::format("{:>10}", target.name);
  for (std::size_t s = 0; s < sources.size(); ++s) {
    out += fmt::format("\n{:10}", sources[s].name);
    for (const double value : table[s])
      out += value < 0 ? fmt::format("{:>10}", "-") : fmt::format("{:10.3f}", value / unit);
  }
  return out;
}

}  // namespace

TEST_CASE("between any two kinds of mesh sums close, a constant stays, integrals are kept, missing cells or not") {
  const std::vector<Kind> sources = source_kinds(), targets = target_kinds();
  Table sums, integrals, constants;
  for (const Kind& source : sources) {
    CAPTURE(source.name);
    sums.emplace_back();
    integrals.emplace_back();
    constants.emplace_back();
    const std::vector<double> constant(source.mesh->size(), 287.3), field = random_field(source.mesh->size(), 0),
                                                                    gappy = random_field(source.mesh->size(), 0.3);
    for (const Kind& target : targets) {
      CAPTURE(target.name);
      const auto [map, closure] = overlap::conservative(*source.mesh, *target.mesh, Quantity::mean);
      CHECK(closure.holds);
      if (source.global) CHECK(closure.rows_checked == target.mesh->size());
      if (source.global && target.global) CHECK(closure.columns_checked == source.mesh->size());
      sums.back().push_back(sums_ratio(map, source, target));
      CHECK(sums.back().back() <= 1);
      if (map.pairings() == 0) {  // two regions that do not meet
        CHECK_FALSE((source.global || target.global));
        integrals.back().push_back(-1);
        constants.back().push_back(-1);
        continue;
      }
      const Applied same = carried(map, constant);
      constants.back().push_back(std::max(relative(same.highest, 287.3), relative(same.lowest, 287.3)));
      CHECK(constants.back().back() <= kConstant);
      double worst = 0;
      for (const auto& values : {field, gappy}) {
        const double exact = source_integral(map, source, values);
        REQUIRE(exact > 0);
        worst = std::max(worst, relative(carried(map, values).integral, exact));
      }
      integrals.back().push_back(worst);
      CHECK(worst <= kIntegral);
    }
  }
  MESSAGE(shown("Sums over rows and columns against the cells' areas, of the bound 1e-12 + 8 eps perimeter / area",
                sums, sources, targets, 1));
  MESSAGE(
      shown("Integrals before and after, also with 30 % missing, in 1e-13", integrals, sources, targets, kIntegral));
  MESSAGE(shown("A constant before and after, in 1e-14", constants, sources, targets, kConstant));
}

TEST_CASE("between any two kinds of global mesh a linear reconstruction keeps the integral") {
  std::vector<Kind> kinds;
  for (Kind& kind : source_kinds()) {
    if (kind.global) kinds.push_back(std::move(kind));
  }
  Table integrals;
  for (const Kind& source : kinds) {
    CAPTURE(source.name);
    integrals.emplace_back();
    const auto gradient = overlap::make_gradient(*source.mesh, Quantity::mean, true);
    std::vector<std::uint32_t> all(gradient->columns());
    std::iota(all.begin(), all.end(), 0U);
    const std::vector<double> field = random_field(source.mesh->size(), 0);
    std::vector<double> columns(all.size());
    gradient->extender(all)->extend(field, columns);
    ExactSum exact;
    for (std::size_t c = 0; c < field.size(); ++c) exact.add(field[c] * source.mesh->area(c));
    for (const Kind& target : kinds) {
      CAPTURE(target.name);
      const auto [map, closure] = overlap::conservative_linear(*source.mesh, *target.mesh, Quantity::mean);
      CHECK(closure.holds);
      CHECK(closure.rows_checked == target.mesh->size());
      CHECK(closure.columns_checked == source.mesh->size());
      integrals.back().push_back(relative(carried(map, columns).integral, exact.value()));
      CHECK(integrals.back().back() <= kIntegral);
    }
  }
  MESSAGE(shown("Integrals before and after a linear reconstruction, in 1e-13", integrals, kinds, kinds, kIntegral));
}

TEST_CASE("any mesh onto itself is the identity") {
  for (const Kind& kind : source_kinds()) {
    CAPTURE(kind.name);
    const LinearMap map = overlap::conservative(*kind.mesh, *kind.mesh, Quantity::mean).map;
    CHECK(map.pairings() == kind.mesh->size());
    double worst = 0;
    for (std::size_t row = 0; row < map.rows(); ++row) {
      if (map.row_start[row] != row || map.column[row] != row) worst = 1;
      worst = std::max(worst, std::abs(map.share[row] - 1) / kind.bound[row]);
    }
    CHECK(worst <= 1);
  }
}

TEST_CASE("cells of every kind of global mesh add up to 4 pi") {
  for (const Kind& kind : source_kinds()) {
    if (!kind.global) continue;
    CAPTURE(kind.name);
    CHECK(relative(total_area(*kind.mesh), 4 * std::numbers::pi) < 1e-12);
  }
}

TEST_CASE("a grid with two northern poles covers what its outermost sides enclose, no cell twice") {
  const mesh::MeshPtr m = folded(24, 80);
  // Arcs that no other cell runs through the other way bound the grid; chained up they are one loop around it.
  std::map<std::tuple<double, double, double, double>, sphere::Arc> open;
  for (std::size_t k = 0; k < m->size(); ++k) {
    const sphere::Polygon cell = m->cell(k);
    for (const sphere::Arc& arc : cell.pieces.front().loops.front()) {
      if (open.erase({arc.to.x, arc.to.y, arc.from.x, arc.from.y}) == 0) {
        open[{arc.from.x, arc.from.y, arc.to.x, arc.to.y}] = arc;
      }
    }
  }
  REQUIRE(open.size() == 80);
  sphere::Loop rim{open.begin()->second};
  while (rim.size() < open.size()) {
    const auto next =
        std::find_if(open.begin(), open.end(), [&](const auto& o) { return o.second.from == rim.back().to; });
    REQUIRE(next != open.end());
    rim.push_back(next->second);
  }
  const double enclosed = sphere::area({{{{rim}}}});
  CHECK(enclosed > 1);
  CHECK(relative(total_area(*m), enclosed) < 1e-12);
}
