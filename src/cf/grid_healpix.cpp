// HEALPix grids: the grid mapping `healpix` (CF 1.13 appendix F): refinement_level, indexing_scheme, healpix_index.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <set>

#include "grid.h"
#include "windrow/mesh/mesh.h"

namespace windrow::cf {

namespace {

enum class Scheme { nested, ring, nuniq, zuniq };

Scheme scheme_of(const Context& context) {
  const std::string word = lower(context.mapping.variable->text("indexing_scheme"));
  if (word == "nested" || word == "nest") return Scheme::nested;
  if (word == "ring") return Scheme::ring;
  if (word == "nuniq" || word == "nested_unique") return Scheme::nuniq;
  if (word == "zuniq") return Scheme::zuniq;
  context.fail(
      fmt::format("grid mapping '{}' has the indexing_scheme '{}'; nested, ring, nested_unique or zuniq was "
                  "expected",
                  context.mapping.variable->name, word));
}

/// refinement_level where the scheme needs it; -1 otherwise.
int level_of(const Context& context, Scheme scheme) {
  if (scheme == Scheme::nuniq || scheme == Scheme::zuniq) return -1;
  const nc::Att* att = context.mapping.variable->find("refinement_level");
  const double level = att == nullptr          ? -1
                       : !att->numbers.empty() ? att->numbers[0]
                                               : std::strtod(att->text.c_str(), nullptr);
  if (level != std::floor(level) || level < 0 || level > 29)
    context.fail(att == nullptr
                     ? fmt::format("grid mapping '{}' has no refinement_level", context.mapping.variable->name)
                     : fmt::format("refinement_level of grid mapping '{}' is {:g}; 0 to 29 was expected",
                                   context.mapping.variable->name, level));
  return int(level);
}

/// The variable of indices: by standard_name, the only one over one of the data's dimensions.
const nc::Var* index_variable(const Context& context) {
  for (const nc::Var& var : context.header().vars) {
    if (lower(var.text("standard_name")) != "healpix_index" || var.dims.size() != 1) continue;
    if (std::ranges::any_of(context.axes, [&](const Axis& axis) { return axis.dim->id == var.dims[0]; })) return &var;
  }
  return nullptr;
}

mesh::HealpixCell cell_of(Scheme scheme, int level, std::uint64_t number, const std::string& place) {
  if (scheme == Scheme::ring) return mesh::healpix_from_ring(level, number, place);
  if (scheme == Scheme::nuniq) return mesh::healpix_from_nuniq(number, place);
  if (scheme == Scheme::zuniq) return mesh::healpix_from_zuniq(number, place);
  return {level, number};
}

/// The dimension of all cells when none is indexed.
const nc::Dim& whole_dim(const Context& context, int level, Scheme scheme) {
  if (level < 0)
    context.fail(
        fmt::format("on a HEALPix grid of the indexing_scheme {}, but no variable has the standard_name "
                    "healpix_index",
                    scheme == Scheme::nuniq ? "nested_unique" : "zuniq"));
  const std::uint64_t all = 12ULL << (2 * level);
  for (const Axis& axis : context.axes)
    if (axis.dim->length == all && axis.role != Role::time && axis.role != Role::vertical) return *axis.dim;
  context.fail(
      fmt::format("on a HEALPix grid of level {} without healpix_index, but no dimension has the length {} of "
                  "all its cells",
                  level, all));
}

}  // namespace

std::optional<FileGrid> find_healpix(const Context& context) {
  if (context.mapping.kind != Mapping::Kind::healpix) return std::nullopt;
  const Scheme scheme = scheme_of(context);
  const int level = level_of(context, scheme);
  const nc::Var* indices = index_variable(context);
  const nc::Dim& dim = indices != nullptr ? context.header().dim(indices->dims[0]) : whole_dim(context, level, scheme);
  if (dim.length == 0) context.fail(fmt::format("dimension '{}' is empty", dim.name));
  const std::uint64_t all = level >= 0 ? 12ULL << (2 * level) : 0;

  FileGrid result;
  result.dims = {dim.id};
  result.places = {{}, {0}, {}, 1};
  std::vector<mesh::HealpixCell>& cells = result.grid.healpix;
  const std::string place = context.header().path;
  std::size_t missing = 0, repeated = 0;
  if (indices == nullptr) {
    for (std::uint64_t number = 0; number < dim.length; ++number)
      cells.push_back(cell_of(scheme, level, number, place));
    result.places = Places::all(dim.length);
  } else {
    const nc::Att* fill = indices->find("_FillValue");
    std::set<std::pair<int, std::uint64_t>> seen;
    const std::vector<std::int64_t> numbers = context.inputs.integers(*indices);
    for (std::size_t i = 0; i < numbers.size(); ++i) {
      if (fill != nullptr && !fill->numbers.empty() && double(numbers[i]) == fill->numbers[0]) {
        ++missing;
        continue;
      }
      if (numbers[i] < 0 || (all > 0 && std::uint64_t(numbers[i]) >= all))
        throw Error(Failure::data, place,
                    fmt::format("'{}' is {} at position {}, but cells of level {} are numbered 0 to {}", indices->name,
                                numbers[i], i, level, all - 1));
      const mesh::HealpixCell cell = cell_of(scheme, level, std::uint64_t(numbers[i]), place);
      if (!seen.insert({cell.level, cell.nested}).second) {
        ++repeated;
        continue;
      }
      cells.push_back(cell);
      result.places.rows.push_back(i);
    }
  }
  if (cells.empty()) context.fail("none of its cells has a HEALPix index");
  const auto say = [&](std::size_t count, const char* what) {
    if (count > 0)
      context.remarks.push_back(
          fmt::format("{} cell{} {} {} left out", count, count > 1 ? "s" : "", what, count > 1 ? "are" : "is"));
  };
  say(missing, "without a HEALPix index");
  say(repeated, "repeating an earlier one");
  const auto [low, high] = std::ranges::minmax(cells, {}, &mesh::HealpixCell::level);
  result.grid.kind = GridKind::healpix;
  result.grid.mapping = mapping_records(context.mapping);
  const char* names[] = {"nested", "ring", "nested_unique", "zuniq"};
  result.grid.how = fmt::format("HEALPix, {} cells of level {}{}, {}", cells.size(), low.level,
                                high.level > low.level ? fmt::format(" to {}", high.level) : "",
                                all == cells.size() ? "all of the globe" : "part of the globe");
  result.grid.why = fmt::format("{}, indexing_scheme {}{}", mapping_text(context.mapping), names[int(scheme)],
                                indices != nullptr ? fmt::format(", indices '{}'", indices->name) : "");
  return result;
}

}  // namespace windrow::cf
