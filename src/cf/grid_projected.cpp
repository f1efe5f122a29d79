// Projected grids: axes in the plane of the CRS that a grid mapping describes (CF 1.13 section 5.6 and appendix F), or
// that the job names. What the mapping means is not decided here.
#include <fmt/format.h>

#include <algorithm>

#include "grid.h"
#include "windrow/units/units.h"

namespace windrow::cf {

namespace {

/// Units of both axes; where they are a multiple of the metre that has no plain name, `scale` makes metres of them.
std::string axis_units_of(const Context& context, const nc::Var& x, const nc::Var& y, double& scale) {
  std::string units = x.text("units");
  if (units != y.text("units"))
    context.fail(
        fmt::format("axes '{}' and '{}' have different units ('{}' and '{}')", x.name, y.name, units, y.text("units")));
  if (units.empty()) units = context.hints.axis_units;
  if (units.empty())
    context.fail(
        fmt::format("axes '{}' and '{}' have no units; add grid = {{ units = \"m\" }} (or \"km\", "
                    "\"radian\") to the [[run]]",
                    x.name, y.name));
  if (std::string plain = plain_axis_units(units); !plain.empty()) return plain;
  try {
    const units::Affine affine = units::conversion(units, "m", "", context.header().path).affine;
    if (affine.offset == 0 && affine.scale > 0) {
      scale = affine.scale;
      return "m";
    }
  } catch (const Error&) {
    // An angle, or nothing that UDUNITS knows: handed on as it is.
  }
  return units;
}

AxisCells cells_of(const Context& context, const nc::Var& coordinate, const std::string& units, double scale) {
  AxisValues values = read_axis(context, coordinate);
  values.unit = units;
  for (std::vector<double>* list : {&values.centres, &values.bounds})
    for (double& value : *list) value *= scale;
  if (scale != 1) values.single_precision = false;
  return plane_cells(std::move(values), context.remarks);
}

}  // namespace

std::optional<FileGrid> find_projected(const Context& context) {
  const Axis* x_axis = context.axis(Role::x);
  const Axis* y_axis = context.axis(Role::y);
  if (x_axis == nullptr || y_axis == nullptr) return std::nullopt;
  for (const Axis* axis : {x_axis, y_axis})
    if (axis->dim->length == 0) context.fail(fmt::format("dimension '{}' is empty", axis->dim->name));
  const bool mapped = context.mapping.kind == Mapping::Kind::projected;
  if (!mapped && context.hints.crs.empty()) {
    const std::string what = fmt::format("'{}' and '{}' are axes of a projection, but no grid mapping says which",
                                         x_axis->values->name, y_axis->values->name);
    if (!latlon_pair(context, 2)) context.fail(what + "; add grid = { crs = \"...\" } to the [[run]]");
    context.remarks.push_back(what + "; its two-dimensional latitudes and longitudes are used");
    return std::nullopt;
  }
  if (mapped && !context.hints.crs.empty())
    context.remarks.push_back(fmt::format("the CRS is that of the file's {}, not the job's '{}'",
                                          mapping_text(context.mapping), context.hints.crs));
  double scale = 1;
  const std::string units = axis_units_of(context, *x_axis->values, *y_axis->values, scale);
  const AxisCells x = cells_of(context, *x_axis->values, units, scale);
  const AxisCells y = cells_of(context, *y_axis->values, units, scale);

  FileGrid result;
  Grid& grid = result.grid;
  grid.kind = GridKind::projected;
  grid.x_edges = x.edges;
  grid.y_edges = y.edges;
  grid.axis_units = units;
  if (mapped)
    grid.mapping = mapping_records(context.mapping);
  else
    grid.crs = context.hints.crs;
  const std::string spacing =
      x.step > 0 && y.step > 0 ? fmt::format(", {:.6g} x {:.6g} {}", x.step, y.step, units) : std::string();
  grid.how =
      fmt::format("projected ({}){}, {} x {} cells, x {:g} .. {:g}, y {:g} .. {:g} {}, {}",
                  mapped ? context.mapping.name : grid.crs, spacing, y.index.size(), x.index.size(), x.edges.front(),
                  x.edges.back(), y.edges.front(), y.edges.back(), units, edges_text(y, x, false, "y", "x"));
  grid.why = fmt::format("axes {} and {}, {}", evidence(*y_axis->values), evidence(*x_axis->values),
                         mapped ? mapping_text(context.mapping) : "CRS from the job");
  result.dims = {y_axis->dim->id, x_axis->dim->id};
  result.places = {y.index, x.index, {}, x_axis->dim->length};
  return result;
}

}  // namespace windrow::cf
