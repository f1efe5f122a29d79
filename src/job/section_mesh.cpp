// [mesh]: where the product lives. Edges of axes as well.
#include <fmt/format.h>

#include <cmath>

#include "sections.h"

namespace windrow::job {

const Keys kMeshKeys{{"name", "kind", "crs", "x", "y", "lon", "lat", "height", "earth"},
                     {"mask", "template", "from", "variable", "polygons", "layer", "id", "sites", "topology"}};

namespace {

const std::vector<std::string> kKindsToCome{"raster", "file", "catchments", "towns", "faces"};
constexpr double kMostCells = 1e9;
// A step such as 0.0083333333333 is meant as 1/120: the number of cells may be off a whole number by this share, and
// the edges are then computed from the ends and that number.
constexpr double kWholeTolerance = 1e-9;
constexpr double kFullCircle = 360 * (1 + 1e-12);

AxisSpec axis(const Table& mesh, const std::string& key, double low, double high) {
  const Keys keys{{"from", "to", "step"}, {}};
  const std::optional<Table> table = mesh.table(key, fmt::format("'{}' of [mesh]", key), keys);
  if (!table) mesh.missing(key, fmt::format("{} = {{ from = ..., to = ..., step = ... }}, the cell edges", key));
  for (const std::string& part : keys.known)
    if (!table->has(part)) table->missing(part, fmt::format("{} = {{ from = ..., to = ..., step = ... }}", key));
  AxisSpec out;
  out.from = *table->number("from", low, high);
  out.to = *table->number("to", low, high);
  out.step = *table->number("step", -1e12, 1e12);
  if (out.from >= out.to)
    table->fail("to", fmt::format("'{}' goes from {} to {}; expected 'from' below 'to'", key, out.from, out.to));
  if (out.step <= 0) table->fail("step", fmt::format("'step' is {}; expected a positive number", out.step));
  const double cells = (out.to - out.from) / out.step;
  if (cells > kMostCells)
    table->fail("step",
                fmt::format("{:.3g} cells along '{}'; expected at most {:g} in the mesh", cells, key, kMostCells));
  const double whole = std::max(std::round(cells), 1.0);
  if (std::fabs(cells - whole) > kWholeTolerance * whole)
    table->fail("step", fmt::format("{} to {} is {:.9g} steps of {}; expected a whole number of steps", out.from,
                                    out.to, cells, out.step));
  return out;
}

void refuse_keys(const Table& table, const std::vector<std::string>& keys, const std::string& kind,
                 const std::string& instead) {
  for (const std::string& key : keys)
    if (table.has(key))
      table.fail(key, fmt::format("'{}' does not go with mesh kind '{}'; expected {}", key, kind, instead));
}

}  // namespace

std::vector<double> AxisSpec::edges() const {
  const auto count = static_cast<long long>(std::max(std::round((to - from) / step), 1.0));
  const auto n = static_cast<double>(count);
  std::vector<double> out(static_cast<std::size_t>(count) + 1);
  for (std::size_t i = 0; i < out.size(); ++i) {
    const auto k = static_cast<double>(i);
    out[i] = (from * (n - k) + to * k) / n;
  }
  return out;
}

void refuse_later_kind(const Document& document, const Value& mesh) {
  for (const Member& member : mesh.members) {
    if (member.key != "kind" || member.value.kind != Value::Kind::text) continue;
    for (const std::string& kind : kKindsToCome)
      if (kind == member.value.text)
        document.fail(member.value.at, fmt::format("'{}' is not in this version; expected latlon or projected", kind));
  }
}

MeshSpec read_mesh(const Table& table) {
  MeshSpec mesh;
  mesh.name = table.text("name", "mesh");
  check_name(table, "name", mesh.name);
  mesh.kind = table.word<MeshKind>("kind", {{{"latlon", MeshKind::latlon}, {"projected", MeshKind::projected}}, {}},
                                   MeshKind::latlon);
  if (mesh.kind == MeshKind::latlon) {
    if (!table.has("kind") && table.has("x"))
      table.fail("x", "'x' needs kind \"projected\" and a 'crs'; expected 'lon' and 'lat' otherwise");
    refuse_keys(table, {"x", "y", "crs"}, "latlon", "'lon' and 'lat' only");
    mesh.x = axis(table, "lon", -720, 720);
    mesh.y = axis(table, "lat", -90, 90);
    if (mesh.x.to - mesh.x.from > kFullCircle)
      table.fail("lon", fmt::format("'lon' spans {} degrees; expected at most 360", mesh.x.to - mesh.x.from));
  } else {
    refuse_keys(table, {"lon", "lat"}, "projected", "'x' and 'y'");
    mesh.crs = table.text("crs", "");
    if (!table.has("crs")) table.missing("crs", "a projection PROJ knows, such as \"EPSG:3035\"");
    if (mesh.crs.empty()) table.fail("crs", "'crs' is empty; expected a projection PROJ knows, such as \"EPSG:3035\"");
    mesh.x = axis(table, "x", -1e12, 1e12);
    mesh.y = axis(table, "y", -1e12, 1e12);
  }
  const double cells =
      std::round((mesh.x.to - mesh.x.from) / mesh.x.step) * std::round((mesh.y.to - mesh.y.from) / mesh.y.step);
  if (cells > kMostCells)
    table.document().fail(table.at(),
                          fmt::format("the mesh has {:.3g} cells; expected at most {:g}", cells, kMostCells));
  mesh.height = table.path("height");
  mesh.place = table.document().place(table.at("crs"));
  mesh.excerpt = table.document().excerpt(table.at("crs"));
  mesh.ellipsoid = table.word<bool>("earth", {{{"sphere", false}, {"ellipsoid", true}}, {}}, false);
  return mesh;
}

}  // namespace windrow::job
