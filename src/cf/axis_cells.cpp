// Cell edges of axes. CF 1.13 section 7.1: bounds decide where they exist; there are no default
// bounds, so inferred ones lie half-way between centres.
#include "axis_cells.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <limits>
#include <optional>

namespace windrow::cf {

namespace {

/// Bounds of neighbours may differ by this share of a cell and still be one edge (decimal rounding in the file).
constexpr double kEdgeTolerance = 1e-3;
/// Spacings whose largest exceeds the median by this factor hold a gap, when the others are all alike.
constexpr double kGapFactor = 1.5;

struct Cell {
  double centre = 0, low = 0, high = 0;
  std::size_t index = 0;
};

/// The shortest decimal that rounds to the same float: what a float32 coordinate was meant to be.
double decimal_of_float(double value) {
  return std::strtod(fmt::format("{}", static_cast<float>(value)).c_str(), nullptr);
}

bool float_representable(const std::vector<double>& values) {
  return std::ranges::all_of(values, [](double v) { return double(float(v)) == v; });
}

double rounding_of(const std::vector<double>& values) {
  double largest = 0;
  for (const double v : values) largest = std::max(largest, std::abs(v));
  return 4 * largest * double(std::numeric_limits<float>::epsilon()) / 2;
}

/// Positions first + i * step, i = 0..count-1, each correctly rounded where the grid divides the circle.
struct Regular {
  double first = 0, step = 0;
  double quarter = 0, divisions = 0;  ///< value = (quarter + 4 i) * 90 / divisions when divisions > 0
  [[nodiscard]] double at(double i) const {
    return divisions > 0 ? (quarter + 4 * i) * 90 / divisions : first + i * step;
  }
};

std::optional<Regular> regular(const std::vector<double>& values, double tolerance, bool circle = true) {
  const std::size_t n = values.size();
  if (n < 2) return std::nullopt;
  Regular grid{values[0], (values[n - 1] - values[0]) / double(n - 1), 0, 0};
  if (!(grid.step > 2 * tolerance)) return std::nullopt;
  const auto fits = [&](const Regular& candidate, double bound) {
    for (std::size_t i = 0; i < n; ++i)
      if (!(std::abs(candidate.at(double(i)) - values[i]) <= bound)) return false;
    return true;
  };
  if (!fits(grid, tolerance)) return std::nullopt;
  if (!circle) return grid;
  Regular divided = grid;
  divided.divisions = std::round(360 / grid.step);
  divided.quarter = std::round(values[0] * divided.divisions / 90);
  if (fits(divided, 2 * tolerance)) {
    divided.step = 360 / divided.divisions;
    return divided;
  }
  return grid;
}

[[noreturn]] void fail(const AxisValues& values, const std::string& text) {
  throw Error(Failure::data, values.place, fmt::format("coordinate '{}': {}", values.name, text));
}

double median_spacing(const std::vector<Cell>& cells) {
  std::vector<double> spacing;
  for (std::size_t i = 1; i < cells.size(); ++i) spacing.push_back(cells[i].centre - cells[i - 1].centre);
  std::ranges::nth_element(spacing, spacing.begin() + std::ptrdiff_t(spacing.size() / 2));
  return spacing[spacing.size() / 2];
}

/// Places i at which the spacing before cell i stands out, when four fifths of all spacings equal the median.
std::vector<std::size_t> gaps(const std::vector<Cell>& cells, double tolerance) {
  std::vector<std::size_t> found;
  if (cells.size() < 3) return found;
  const double median = median_spacing(cells);
  std::size_t alike = 0;
  for (std::size_t i = 1; i < cells.size(); ++i) {
    const double spacing = cells[i].centre - cells[i - 1].centre;
    if (std::abs(spacing - median) <= std::max(2 * tolerance, kEdgeTolerance * median)) ++alike;
    if (spacing > kGapFactor * median) found.push_back(i);
  }
  if (alike * 5 < (cells.size() - 1) * 4 && !(cells.size() < 6 && alike + 1 >= cells.size() - 1)) found.clear();
  return found;
}

void refuse_gap(const AxisValues& values, const std::vector<Cell>& cells, double tolerance) {
  const std::vector<std::size_t> found = gaps(cells, tolerance);
  if (found.empty()) return;
  fail(
      values,
      fmt::format("gap between {:g} and {:g} {} while the other cells are {:g} {} apart; a grid without gaps is "
                  "needed",
                  cells[found[0] - 1].centre, cells[found[0]].centre, values.unit, median_spacing(cells), values.unit));
}

void require_ascending(const AxisValues& values, const std::vector<Cell>& cells) {
  for (std::size_t i = 1; i < cells.size(); ++i)
    if (!(cells[i].centre > cells[i - 1].centre))
      fail(values, fmt::format("not monotonic: {:g} and {:g} stand side by side (positions {} and {})",
                               values.centres[cells[i - 1].index], values.centres[cells[i].index], cells[i - 1].index,
                               cells[i].index));
}

/// Cells in array order, with oriented bounds. Bounds equal throughout to their centres count as none.
std::vector<Cell> to_cells(AxisValues& values, Remarks& remarks) {
  const std::size_t n = values.centres.size();
  bool flat = !values.bounds.empty();
  for (std::size_t i = 0; flat && i < n; ++i) flat = values.bounds[2 * i] == values.bounds[2 * i + 1];
  if (flat) {
    remarks.push_back(fmt::format("bounds '{}' have no width and are not used", values.bounds_name));
    values.bounds.clear();
  }
  std::vector<Cell> cells(n);
  for (std::size_t i = 0; i < n; ++i) {
    cells[i] = {values.centres[i], 0, 0, i};
    if (values.bounds.empty()) continue;
    cells[i].low = values.bounds[2 * i];
    cells[i].high = values.bounds[2 * i + 1];
  }
  return cells;
}

/// Sorts each pair of bounds; says so when the pairs do not run the way the coordinate does.
void orient_bounds(const AxisValues& values, std::vector<Cell>& cells, bool descending, Remarks& remarks) {
  if (values.bounds.empty()) return;
  std::size_t against = 0;
  for (Cell& cell : cells) {
    const bool down = cell.low > cell.high;
    if (down) std::swap(cell.low, cell.high);
    against += down != descending;
  }
  if (against > 0 && cells.size() > 1)
    remarks.push_back(
        fmt::format("{} of {} pairs of bounds in '{}' are ordered against the coordinate; they are put in "
                    "order",
                    against, cells.size(), values.bounds_name));
}

std::vector<double> edges_from_bounds(const AxisValues& values, const std::vector<Cell>& cells, double tolerance) {
  std::vector<double> edges;
  for (std::size_t k = 0; k < cells.size(); ++k) {
    const Cell& cell = cells[k];
    const double slack = std::max(2 * tolerance, kEdgeTolerance * (cell.high - cell.low));
    if (!(cell.high > cell.low) || cell.centre < cell.low - slack || cell.centre > cell.high + slack)
      fail(values, fmt::format("bounds '{}' of position {} are {:g} .. {:g} and do not hold the centre {:g}",
                               values.bounds_name, cell.index, cell.low, cell.high, cell.centre));
    if (k == 0) {
      edges.push_back(cell.low);
    } else if (std::abs(cell.low - edges.back()) > slack) {
      fail(values, fmt::format("bounds '{}' {} between {:g} and {:g} {} (positions {} and {})", values.bounds_name,
                               cell.low > edges.back() ? "leave a gap" : "overlap", std::min(cell.low, edges.back()),
                               std::max(cell.low, edges.back()), values.unit, cells[k - 1].index, cell.index));
    }
    edges.push_back(cell.high);
  }
  return edges;
}

/// Half-way between centres; the outermost cells reach as far outwards as inwards.
std::vector<double> edges_half_way(const std::vector<Cell>& cells) {
  const std::size_t n = cells.size();
  std::vector<double> edges(n + 1);
  for (std::size_t i = 1; i < n; ++i) edges[i] = 0.5 * (cells[i - 1].centre + cells[i].centre);
  edges[0] = cells[0].centre - (edges[1] - cells[0].centre);
  edges[n] = cells[n - 1].centre + (cells[n - 1].centre - edges[n - 1]);
  return edges;
}

std::vector<double> edges_regular(const Regular& grid, std::size_t cells) {
  std::vector<double> edges(cells + 1);
  for (std::size_t i = 0; i <= cells; ++i) edges[i] = grid.at(double(i) - 0.5);
  return edges;
}

/// Replaces edges that are regular (but for half cells at the ends) by correctly rounded ones.
double regularise(std::vector<double>& edges, double tolerance, bool circle) {
  const std::size_t n = edges.size();
  if (const auto whole = regular(edges, tolerance, circle)) {
    for (std::size_t i = 0; i < n; ++i) edges[i] = whole->at(double(i));
    return n > 2 ? whole->step : 0;
  }
  if (n < 5) return 0;
  const auto inner = regular(std::vector<double>(edges.begin() + 1, edges.end() - 1), tolerance, circle);
  if (!inner) return 0;
  for (std::size_t i = 1; i + 1 < n; ++i) edges[i] = inner->at(double(i - 1));
  return 0;
}

/// Edges inferred from the centres alone.
void infer_edges(const AxisValues& values, const std::vector<Cell>& cells, double tolerance, bool circle,
                 AxisCells& result) {
  if (cells.size() == 1)
    fail(values,
         fmt::format("a single value ({:g}) without bounds, so the extent of its cell is not known", cells[0].centre));
  if (const auto grid = regular(result.centres, tolerance, circle)) {
    result.edges = edges_regular(*grid, cells.size());
    result.step = grid->step;
  } else {
    result.edges = edges_half_way(cells);
  }
}

/// Undoes float rounding of centres and bounds alike; returns the tolerance for both.
double clean_values(AxisValues& values) {
  double tolerance = clean_rounding(values.centres, values.single_precision);
  if (!values.bounds.empty()) tolerance = std::max(tolerance, clean_rounding(values.bounds, values.single_precision));
  return tolerance;
}

AxisCells finish(const AxisValues& values, const std::vector<Cell>& cells, double tolerance, bool circle = true) {
  AxisCells result;
  for (const Cell& cell : cells) {
    result.index.push_back(cell.index);
    result.centres.push_back(cell.centre);
  }
  result.from_bounds = !values.bounds.empty();
  if (result.from_bounds) {
    result.edges = edges_from_bounds(values, cells, tolerance);
    result.step = regularise(result.edges, tolerance, circle);
  } else {
    infer_edges(values, cells, tolerance, circle, result);
  }
  return result;
}

void close_at_poles(const AxisValues& values, AxisCells& result, double tolerance, Remarks& remarks) {
  for (const double side : {-1.0, 1.0}) {
    double& edge = side < 0 ? result.edges.front() : result.edges.back();
    const double inner = side < 0 ? result.edges[1] : result.edges[result.edges.size() - 2];
    const double beyond = side * edge - 90, width = std::abs(edge - inner);
    if (beyond > 2 * tolerance && result.from_bounds)
      remarks.push_back(
          fmt::format("bounds '{}' reach {:g} degrees; the edge is set to the pole", values.bounds_name, edge));
    const bool almost = !result.from_bounds && result.step == 0 && beyond < 0 && -beyond < 0.5 * width;
    if (almost && -beyond > 2 * tolerance)
      remarks.push_back(
          fmt::format("the outermost row of '{}' is taken to reach the pole: half-way edges would end at "
                      "{:g} degrees",
                      values.name, edge));
    if (beyond > -2 * tolerance || almost) edge = side * 90;
  }
}

/// Follows the array round the globe so that centres ascend; descending arrays are turned round first.
void unwrap(const AxisValues& values, std::vector<Cell>& cells, bool descending) {
  if (descending) std::ranges::reverse(cells);
  double turns = 0;
  std::size_t jumps = 0;
  for (std::size_t i = 1; i < cells.size(); ++i) {
    const double raw = values.centres[cells[i].index], before = values.centres[cells[i - 1].index];
    if (raw - before < -180) {
      turns += 360;
      ++jumps;
    }
    cells[i].centre = raw + turns;
  }
  if (jumps > 1) fail(values, fmt::format("jumps by a full turn {} times; once was expected at most", jumps));
}

/// Bounds may be given in another turn than the centre (359.5 .. 0.5 about 0).
void follow_centres(const AxisValues& values, std::vector<Cell>& cells, bool descending) {
  if (values.bounds.empty()) return;
  for (Cell& cell : cells) {
    const double raw = values.centres[cell.index];
    const double low = std::min(cell.low, cell.high), high = std::max(cell.low, cell.high);
    double shift_low = cell.centre - raw, shift_high = shift_low;
    if (raw < low || raw > high) {
      shift_low = 360 * std::round((cell.centre - cell.low) / 360);
      shift_high = 360 * std::round((cell.centre - cell.high) / 360);
    }
    cell.low += shift_low;
    cell.high += shift_high;
    // A turn between the two ends of one pair was no disorder of the file: give the pair the array's own direction.
    if (shift_low != shift_high && (cell.low > cell.high) != descending) std::swap(cell.low, cell.high);
  }
}

/// Drops columns that repeat the first ones a full turn later.
void drop_repeated(const AxisValues& values, std::vector<Cell>& cells, double tolerance, Remarks& remarks) {
  const double span = values.bounds.empty() ? cells.back().centre - cells.front().centre + tolerance
                                            : cells.back().high - cells.front().low - 2 * tolerance;
  if (values.bounds.empty() ? span < 360 : span <= 360) return;
  const double limit = cells.front().centre + 360 - 2 * tolerance;
  std::size_t dropped = 0;
  while (cells.size() > 1 && cells.back().centre >= limit) {
    cells.pop_back();
    ++dropped;
  }
  if (dropped > 0)
    remarks.push_back(fmt::format("{} longitude column{} of '{}' repeat{} the first a full turn later and {} dropped",
                                  dropped, dropped > 1 ? "s" : "", values.name, dropped > 1 ? "" : "s",
                                  dropped > 1 ? "are" : "is"));
}

/// A window cut across the array's seam (0 .. 10, 350 .. 359): turned so that it is one piece.
void rotate_at_gap(std::vector<Cell>& cells, double tolerance, Remarks& remarks, const std::string& name) {
  const std::vector<std::size_t> found = gaps(cells, tolerance);
  if (found.size() != 1) return;
  const double seam = cells.front().centre + 360 - cells.back().centre;
  if (!(seam > 0 && seam < kGapFactor * median_spacing(cells))) return;
  for (std::size_t i = found[0]; i < cells.size(); ++i) {
    cells[i].centre -= 360;
    cells[i].low -= 360;
    cells[i].high -= 360;
  }
  std::rotate(cells.begin(), cells.begin() + std::ptrdiff_t(found[0]), cells.end());
  remarks.push_back(fmt::format("'{}' crosses the end of its array; columns from position {} on come first", name,
                                cells.front().index));
}

/// Keeps centres within one turn of the usual ranges (0 .. 360, -180 .. 180).
void shift_turns(const AxisValues& values, std::vector<Cell>& cells) {
  const bool beyond = values.bounds.empty() ? cells.back().centre >= 360 : cells.back().high > 360 + kEdgeTolerance;
  const double shift = beyond ? -360 : cells.front().centre < -360 ? 360 : 0;
  for (Cell& cell : cells) {
    cell.centre += shift;
    cell.low += shift;
    cell.high += shift;
  }
}

/// Makes a span of 360 within rounding exactly 360; a span beyond is an error.
void close_circle(const AxisValues& values, AxisCells& result, double tolerance, Remarks& remarks) {
  std::vector<double>& edges = result.edges;
  const std::size_t n = edges.size() - 1;
  const double width = (edges[n] - edges[0]) / double(n), off = edges[n] - edges[0] - 360;
  const double seam = result.centres.front() + 360 - result.centres.back();
  double widest = 0;
  for (std::size_t i = 1; i < n; ++i) widest = std::max(widest, result.centres[i] - result.centres[i - 1]);
  if (!result.from_bounds && n > 2 && seam > 0 && seam <= widest * (1 + kEdgeTolerance) &&
      std::abs(off) > 2 * tolerance) {
    edges[0] = result.centres.front() - 0.5 * seam;  // global and irregular: the seam's edge is half-way as well
    edges[n] = edges[0] + 360;
  } else if (std::abs(off) <= std::max(2 * tolerance, kEdgeTolerance * width)) {
    if (std::abs(off) > 2 * tolerance)
      remarks.push_back(fmt::format("the cells of '{}' span {:.6f} degrees; the last edge is moved to make it 360",
                                    values.name, off + 360));
    edges[n] = edges[0] + 360;
  } else if (off > 0) {
    fail(values, fmt::format("its cells span {:g} degrees, more than the globe", off + 360));
  }
}

}  // namespace

double clean_rounding(std::vector<double>& values, bool single_precision) {
  if (!single_precision && !float_representable(values)) return 1e-9;
  const double tolerance = std::max(rounding_of(values), 1e-9);
  for (double& v : values) v = decimal_of_float(v);
  return tolerance;
}

AxisCells plane_cells(AxisValues values, Remarks& remarks) {
  double tolerance = clean_values(values), largest = 0;
  for (const double centre : values.centres) largest = std::max(largest, std::abs(centre));
  // Metres far from the origin: differences of doubles are rounded to more than what counts for degrees.
  tolerance = std::max(tolerance, 16 * largest * std::numeric_limits<double>::epsilon());
  std::vector<Cell> cells = to_cells(values, remarks);
  const bool descending = cells.front().centre > cells.back().centre;
  orient_bounds(values, cells, descending, remarks);
  if (descending) std::ranges::reverse(cells);
  require_ascending(values, cells);
  if (values.bounds.empty()) refuse_gap(values, cells, tolerance);
  return finish(values, cells, tolerance, false);
}

AxisCells latitude_cells(AxisValues values, Remarks& remarks) {
  const double tolerance = clean_values(values);
  for (double& centre : values.centres) {
    if (std::abs(centre) > 90 + 1e-3) fail(values, fmt::format("latitude {:g} lies beyond the pole", centre));
    centre = std::clamp(centre, -90.0, 90.0);
  }
  std::vector<Cell> cells = to_cells(values, remarks);
  const bool descending = cells.front().centre > cells.back().centre;
  orient_bounds(values, cells, descending, remarks);
  if (descending) std::ranges::reverse(cells);
  require_ascending(values, cells);
  if (values.bounds.empty()) refuse_gap(values, cells, tolerance);
  AxisCells result = finish(values, cells, tolerance);
  close_at_poles(values, result, tolerance, remarks);
  return result;
}

AxisCells longitude_cells(AxisValues values, Remarks& remarks) {
  const double tolerance = clean_values(values);
  std::vector<Cell> cells = to_cells(values, remarks);
  std::size_t down = 0;
  for (std::size_t i = 1; i < cells.size(); ++i) down += cells[i].centre < cells[i - 1].centre;
  const bool descending = 2 * down > cells.size() - 1;
  unwrap(values, cells, descending);
  follow_centres(values, cells, descending);
  orient_bounds(values, cells, descending, remarks);
  require_ascending(values, cells);
  drop_repeated(values, cells, tolerance, remarks);
  rotate_at_gap(cells, tolerance, remarks, values.name);
  if (values.bounds.empty()) refuse_gap(values, cells, tolerance);
  shift_turns(values, cells);
  AxisCells result = finish(values, cells, tolerance);
  close_circle(values, result, tolerance, remarks);
  return result;
}

}  // namespace windrow::cf
