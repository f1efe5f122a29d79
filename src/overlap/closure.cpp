// Row and column sums of the overlaps against the cells' areas.
#include "closure.h"

#include <fmt/format.h>

#include <cmath>

#include "windrow/base/error.h"

namespace windrow::overlap {
namespace {

// Sum with its own rounding carried along (Neumaier 1974): a column may have a million parts.
struct Sum {
  double value = 0, lost = 0;
  void add(double x) {
    const double next = value + x;
    lost += std::abs(value) >= std::abs(x) ? (value - next) + x : (x - next) + value;
    value = next;
  }
};

void note(double residual, double bound, double& worst, double& worst_bound, bool& holds, const char* what,
          std::size_t index) {
  if (residual > worst || worst_bound == 0) {
    worst = residual;
    worst_bound = bound;
  }
  if (residual <= bound) return;
  holds = false;
  if (!(residual <= 10 * bound)) {
    throw Error(Failure::defect, fmt::format("{} {}", what, index),
                fmt::format("overlaps miss the cell's area by {:.3g} of it, expected at most {:.3g}", residual, bound));
  }
}

}  // namespace

Closure check_closure(const std::vector<Rows>& blocks, const mesh::Mesh& source, const mesh::Mesh& target) {
  Closure closure;
  std::vector<Sum> column(source.size());
  std::vector<std::uint8_t> open(source.size(), 0);
  std::size_t row = 0;
  for (const Rows& block : blocks) {
    std::size_t p = 0;
    for (std::size_t k = 0; k < block.count.size(); ++k, ++row) {
      const bool on_rim = target.on_rim(row);
      Sum sum;
      for (std::uint32_t n = 0; n < block.count[k]; ++n, ++p) {
        const Pairing& pairing = block.pairings[p];
        sum.add(pairing.area);
        column[pairing.column].add(pairing.area);
        if (on_rim) open[pairing.column] = 1;
      }
      if (!block.covered[k]) continue;
      ++closure.rows_checked;
      if (block.bound[k] == 0) continue;  // one pairing that is the cell itself
      const double residual = std::abs((sum.value + sum.lost) / target.area(row) - 1);
      note(residual, block.bound[k], closure.worst_row, closure.worst_row_bound, closure.holds, "mesh cell", row);
    }
  }
  for (std::size_t c = 0; c < column.size(); ++c) {
    if (open[c] || column[c].value == 0) continue;
    ++closure.columns_checked;
    const double area = source.area(c);
    const double residual = std::abs((column[c].value + column[c].lost) / area - 1);
    note(residual, closure_bound(source.perimeter(c), area), closure.worst_column, closure.worst_column_bound,
         closure.holds, "source cell", c);
  }
  return closure;
}

}  // namespace windrow::overlap
