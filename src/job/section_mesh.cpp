// [mesh]: where the product lives. Edges of axes as well.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "sections.h"

namespace windrow::job {

const Keys kMeshKeys{{"name", "kind", "crs", "x", "y", "lon", "lat", "template", "from", "variable", "polygons",
                      "layer", "id", "sites", "topology", "height", "mask", "earth"},
                     {}};
const std::vector<std::pair<std::string, MeshKind>> kMeshKinds{
    {"latlon", MeshKind::latlon}, {"projected", MeshKind::projected},   {"raster", MeshKind::raster},
    {"file", MeshKind::file},     {"catchments", MeshKind::catchments}, {"towns", MeshKind::towns},
    {"faces", MeshKind::faces}};

namespace {

// What a kind of mesh is made of: the keys it takes beside those of every mesh, and how a message sums them up.
struct KindKeys {
  MeshKind kind;
  std::vector<std::string> keys;
  std::string instead;
};
const std::vector<KindKeys> kKindKeys{
    {MeshKind::latlon, {"lon", "lat"}, "'lon' and 'lat' only"},
    {MeshKind::projected, {"crs", "x", "y"}, "'x' and 'y'"},
    {MeshKind::raster, {"template"}, "'template'"},
    {MeshKind::file, {"from", "variable"}, "'from' and 'variable'"},
    {MeshKind::catchments, {"polygons", "layer", "id"}, "'polygons', 'layer' and 'id'"},
    {MeshKind::towns, {"sites"}, "'sites'"},
    {MeshKind::faces, {"from", "topology"}, "'from' and 'topology'"}};
// The key that tells a kind when the word is forgotten.
const std::vector<std::pair<std::string, std::string>> kTellingKeys{{"template", "\"raster\""},
                                                                    {"from", "\"file\" or \"faces\""},
                                                                    {"polygons", "\"catchments\""},
                                                                    {"sites", "\"towns\""}};
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

bool contains(const std::vector<std::string>& words, const std::string& word) {
  return std::find(words.begin(), words.end(), word) != words.end();
}

void refuse_keys_of_other_kinds(const Table& table, MeshKind kind) {
  if (!table.has("kind")) {
    if (table.has("x")) table.fail("x", "'x' needs kind \"projected\" and a 'crs'; expected 'lon' and 'lat' otherwise");
    for (const auto& [key, kinds] : kTellingKeys)
      if (table.has(key))
        table.fail(key, fmt::format("'{}' needs kind {}; expected 'lon' and 'lat' otherwise", key, kinds));
  }
  const KindKeys& own = kKindKeys[static_cast<std::size_t>(kind)];
  for (const std::string& key : kMeshKeys.known)
    for (const KindKeys& other : kKindKeys)
      if (table.has(key) && contains(other.keys, key) && !contains(own.keys, key))
        table.fail(key,
                   fmt::format("'{}' does not go with mesh kind '{}'; expected {}", key, kind_word(kind), own.instead));
  if (kind == MeshKind::towns)
    for (const char* key : {"height", "mask"})
      if (table.has(key))
        table.fail(
            key,
            fmt::format("'{}' does not go with mesh kind 'towns', which are points without area; leave it out", key));
}

// A text that is either absent or says something.
std::string name_of(const Table& table, const std::string& key, const std::string& expected) {
  std::string out = table.text(key, "");
  if (table.has(key) && out.empty())
    table.fail(key, fmt::format("'{}' is empty; expected {}, or no '{}'", key, expected, key));
  return out;
}

std::string source(const Table& table, const std::string& key, const std::string& expected) {
  if (!table.has(key)) table.missing(key, expected);
  return table.path(key);
}

void read_latlon(const Table& table, MeshSpec& mesh) {
  mesh.x = axis(table, "lon", -720, 720);
  mesh.y = axis(table, "lat", -90, 90);
  if (mesh.x.to - mesh.x.from > kFullCircle)
    table.fail("lon", fmt::format("'lon' spans {} degrees; expected at most 360", mesh.x.to - mesh.x.from));
}

void read_projected(const Table& table, MeshSpec& mesh) {
  mesh.crs = table.text("crs", "");
  if (!table.has("crs")) table.missing("crs", "a projection PROJ knows, such as \"EPSG:3035\"");
  if (mesh.crs.empty()) table.fail("crs", "'crs' is empty; expected a projection PROJ knows, such as \"EPSG:3035\"");
  mesh.x = axis(table, "x", -1e12, 1e12);
  mesh.y = axis(table, "y", -1e12, 1e12);
}

void check_count(const Table& table, const MeshSpec& mesh) {
  const double cells =
      std::round((mesh.x.to - mesh.x.from) / mesh.x.step) * std::round((mesh.y.to - mesh.y.from) / mesh.y.step);
  if (cells > kMostCells)
    table.document().fail(table.at(),
                          fmt::format("the mesh has {:.3g} cells; expected at most {:g}", cells, kMostCells));
}

// Reads the kind's own keys; the key that errors of the geometry point at.
std::string read_kind(const Table& table, MeshSpec& mesh) {
  switch (mesh.kind) {
    case MeshKind::latlon:
      read_latlon(table, mesh);
      check_count(table, mesh);
      return "";
    case MeshKind::projected:
      read_projected(table, mesh);
      check_count(table, mesh);
      return "crs";
    case MeshKind::raster:
      mesh.source = source(table, "template", "a raster whose cells the mesh takes, such as template = \"grid.tif\"");
      return "template";
    case MeshKind::file:
      mesh.source = source(table, "from", "a CF NetCDF file whose grid the mesh takes, such as from = \"other.nc\"");
      mesh.variable = name_of(table, "variable", "the name of a variable in that file");
      return "from";
    case MeshKind::catchments:
      mesh.source = source(table, "polygons", "a vector file, such as polygons = \"basins.gpkg\"");
      mesh.layer = name_of(table, "layer", "the name of a layer of that file");
      mesh.id = name_of(table, "id", "the name of the column that tells catchments apart");
      return "polygons";
    case MeshKind::towns:
      mesh.source = source(table, "sites",
                           "a CSV file with station, longitude, latitude and elevation, such as sites = \"towns.csv\"");
      return "sites";
    case MeshKind::faces:
      mesh.source = source(table, "from", "a UGRID NetCDF file, such as from = \"ugrid.nc\"");
      mesh.topology = name_of(table, "topology", "the name of that file's mesh topology variable");
      return "from";
  }
  return "";
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

std::string kind_word(MeshKind kind) { return kMeshKinds[static_cast<std::size_t>(kind)].first; }

bool is_structured(MeshKind kind) {
  return kind == MeshKind::latlon || kind == MeshKind::projected || kind == MeshKind::raster || kind == MeshKind::file;
}

MeshSpec read_mesh(const Table& table) {
  MeshSpec mesh;
  mesh.name = table.text("name", "mesh");
  check_name(table, "name", mesh.name);
  mesh.kind = table.word<MeshKind>("kind", {kMeshKinds, {}}, MeshKind::latlon);
  refuse_keys_of_other_kinds(table, mesh.kind);
  const std::string geometry = read_kind(table, mesh);
  mesh.height = table.path("height");
  mesh.mask = table.path("mask");
  mesh.place = table.document().place(table.at(geometry));
  mesh.excerpt = table.document().excerpt(table.at(geometry));
  mesh.ellipsoid = table.word<bool>("earth", {{{"sphere", false}, {"ellipsoid", true}}, {}}, false);
  return mesh;
}

}  // namespace windrow::job
