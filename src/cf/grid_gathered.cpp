// Gathered grids (CF 1.13 section 8.2): a list of the points that a compressed array keeps of a whole grid.
#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <set>

#include "grid.h"

namespace windrow::cf {

namespace {

constexpr std::uint32_t kNoCell = std::numeric_limits<std::uint32_t>::max();
/// A damaged file must not ask for all memory.
constexpr std::size_t kMostCells = std::size_t{1} << 28;

struct Gathered {
  const nc::Var* list = nullptr;  ///< the index variable
  std::vector<int> dims;          ///< ids of the compressed dimensions, slowest first
};

/// The dimension of the variable whose coordinate variable has the attribute `compress`; nothing without one.
std::optional<Gathered> gathered_of(const Context& context) {
  for (const Axis& axis : context.axes) {
    const nc::Var* list = context.header().find(axis.dim->name);
    if (list == nullptr || list->text("compress").empty()) continue;
    if (list->dims != std::vector<int>{axis.dim->id})
      context.fail(fmt::format("'{}' has the attribute compress, but not the one dimension of its name", list->name));
    Gathered gathered{list, {}};
    for (const std::string& name : words(list->text("compress"))) {
      const auto dim = std::ranges::find(context.header().dims, name, &nc::Dim::name);
      if (dim == context.header().dims.end())
        context.fail(fmt::format("'{}' gathers along '{}', which is no dimension of the file", list->name, name));
      gathered.dims.push_back(dim->id);
    }
    return gathered;
  }
  return std::nullopt;
}

/// Mesh cell at each place of the whole array; kNoCell where the grid has none.
std::vector<std::uint32_t> cell_at(const FileGrid& whole, std::size_t ny, std::size_t nx) {
  std::vector<std::uint32_t> cells(ny * nx, kNoCell);
  for (std::size_t cell = 0; cell < whole.places.size(); ++cell)
    cells[whole.places.y(cell) * nx + whole.places.x(cell)] = std::uint32_t(cell);
  return cells;
}

}  // namespace

std::optional<FileGrid> find_gathered(const Context& context) {
  const auto gathered = gathered_of(context);
  if (!gathered) return std::nullopt;
  const Header& header = context.header();
  // The grid that the compressed dimensions make, as if the variable had them.
  Context whole_context{
      context.inputs,
      context.variable,
      context.hints,
      context.remarks,
      context.mapping,
      axes_of(context.inputs, context.variable, gathered->dims, context.mapping, context.hints, context.remarks)};
  auto whole = find_structured(whole_context);
  if (!whole) return std::nullopt;  // only its points may be known: a reduced grid
  if (whole->dims.size() != 2) context.fail(fmt::format("'{}' gathers along one dimension only", gathered->list->name));
  std::size_t total = 1;
  for (const int id : gathered->dims) {
    const nc::Dim& dim = header.dim(id);
    const bool horizontal = std::ranges::find(whole->dims, id) != whole->dims.end();
    if (!horizontal && dim.length != 1)
      context.fail(fmt::format("'{}' gathers along '{}' too; only horizontal dimensions can be read",
                               gathered->list->name, dim.name));
    total *= std::max<std::size_t>(dim.length, 1);
    if (total > kMostCells) context.fail(fmt::format("'{}' gathers from too many cells", gathered->list->name));
  }
  const std::size_t ny = header.dim(whole->dims[0]).length, nx = header.dim(whole->dims[1]).length;
  std::size_t y_stride = 0, x_stride = 0, stride = 1;
  for (std::size_t k = gathered->dims.size(); k-- > 0;) {
    if (gathered->dims[k] == whole->dims[0]) y_stride = stride;
    if (gathered->dims[k] == whole->dims[1]) x_stride = stride;
    stride *= header.dim(gathered->dims[k]).length;
  }
  const std::vector<std::uint32_t> cells = cell_at(*whole, ny, nx);
  const std::vector<std::int64_t> list = context.inputs.integers(*gathered->list);
  FileGrid result;
  result.grid = std::move(whole->grid);
  result.dims = gathered->list->dims;
  result.places = {{}, {0}, {}, 1};
  std::vector<bool> taken(whole->places.size(), false);
  std::size_t outside = 0;
  for (std::size_t i = 0; i < list.size(); ++i) {
    if (list[i] < 0 || std::size_t(list[i]) >= total)
      context.fail(fmt::format("'{}' is {} at position {}; the gathered dimensions have places 0 to {}",
                               gathered->list->name, list[i], i, total - 1));
    const std::size_t at = std::size_t(list[i]);
    const std::uint32_t cell = cells[at / y_stride % ny * nx + at / x_stride % nx];
    if (cell == kNoCell || taken[cell]) {
      ++outside;
      continue;
    }
    taken[cell] = true;
    result.grid.subset.push_back(cell);
    result.places.rows.push_back(i);
  }
  if (outside > 0)
    context.remarks.push_back(
        fmt::format("{} gathered cell{} repeating another, or one that the whole grid leaves out, {} "
                    "left out",
                    outside, outside > 1 ? "s" : "", outside > 1 ? "are" : "is"));
  if (result.grid.subset.empty()) context.fail("none of its gathered cells is on the grid");
  result.grid.how = fmt::format("{} gathered cells of: {}", result.grid.subset.size(), result.grid.how);
  result.grid.why = fmt::format("'{}' with compress = \"{}\"; {}", gathered->list->name,
                                gathered->list->text("compress"), result.grid.why);
  return result;
}

}  // namespace windrow::cf
