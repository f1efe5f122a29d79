// [job], [[run]] and [output]: what the job is called, which files it reads and what it writes.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>
#include <cmath>

#include "paths.h"
#include "sections.h"
#include "windrow/text/words.h"
#include "windrow/units/units.h"

namespace windrow::job {

const Keys kRootKeys{{"job", "run", "field", "mesh", "stations", "reach", "ensemble", "output"}, {"joint"}};
const Keys kJobKeys{{"title", "workspace", "memory", "threads", "settle", "version"}, {}};
const Keys kRunKeys{{"name", "family", "anchor", "forcing", "files", "land_fraction", "grid"}, {}};
const Keys kGridKeys{{"crs", "pole", "units", "coordinates", "sides"}, {}};
const Keys kOutputKeys{
    {"directory", "name", "calendar", "compression", "level", "digits", "tile", "also", "attributes"}, {"report"}};

namespace {

const std::vector<std::string> kPlaceholders{"field", "run", "mesh", "year", "version"};

std::optional<long long> memory(const Table& table) {
  const Value* value = table.find("memory");
  if (value == nullptr) return std::nullopt;
  std::optional<long long> bytes;
  if (value->kind == Value::Kind::whole)
    bytes = value->whole;
  else if (value->kind == Value::Kind::text)
    bytes = text::parse_bytes(value->text);
  if (!bytes || *bytes <= 0) table.fail("memory", "'memory' is no size; expected one such as \"4 GiB\"");
  return bytes;
}

void check_output_name(const Table& table, const std::string& name) {
  if (name.find('/') != std::string::npos)
    table.fail("name", "'name' holds a '/'; expected a file name: the folder is 'directory'");
  if (!name.ends_with(".nc") || name.size() < 4 || name.front() == '.')
    table.fail("name", "'name' is no product name; expected one that ends in .nc and does not begin with a dot");
  std::size_t at = 0;
  while ((at = name.find_first_of("{}", at)) != std::string::npos) {
    const std::size_t end = name.find('}', at);
    if (name[at] == '}' || end == std::string::npos)
      table.fail("name", "'name' has a brace without its partner; expected placeholders such as {field}");
    const std::string inside = name.substr(at + 1, end - at - 1);
    if (std::find(kPlaceholders.begin(), kPlaceholders.end(), inside) == kPlaceholders.end()) {
      const std::string nearest = text::nearest_word(inside, kPlaceholders);
      table.fail("name", fmt::format("unknown placeholder '{{{}}}'; {}", printable(inside),
                                     nearest.empty() ? "expected {field}, {run}, {mesh}, {year} or {version}"
                                                     : "did you mean '{" + nearest + "}'?"));
    }
    at = end + 1;
  }
  const bool plain = std::all_of(name.begin(), name.end(), [](unsigned char c) { return c >= 0x20 && c != 0x7F; });
  if (!plain) table.fail("name", "'name' holds a control character");
}

// [time, y, x], or [time, cells] where cells stand in no rows: then y is 1.
std::optional<std::array<int, 3>> tile(const Table& table, MeshKind kind) {
  const Value* value = table.find("tile");
  if (value == nullptr) return std::nullopt;
  // The grid of another file may have rows or not.
  const bool two = value->kind == Value::Kind::array && value->items.size() == 2;
  const bool rows = is_structured(kind) && !(kind == MeshKind::file && two);
  const std::size_t count = rows ? 3 : 2;
  const std::string expected = rows ? "[time, y, x]" : "[time, cells]";
  if (value->kind == Value::Kind::text) {
    if (value->text != "auto")
      table.fail("tile", fmt::format("unknown tile '{}'; expected \"auto\" or {}", printable(value->text), expected));
    return std::nullopt;
  }
  if (value->kind == Value::Kind::array && value->items.size() != count)
    table.fail("tile", fmt::format("'tile' has {} {}; expected {}", value->items.size(),
                                   value->items.size() == 1 ? "entry" : "entries", expected));
  const std::vector<double> numbers = *table.numbers("tile", count);
  std::vector<int> whole;
  for (std::size_t i = 0; i < count; ++i) {
    const Value& item = value->items[i];
    if (item.kind != Value::Kind::whole || item.whole < 1 || item.whole > 1'000'000)
      table.document().fail(
          item.at, fmt::format("an entry of 'tile' is {}; expected a whole number from 1 to 1000000", numbers[i]));
    whole.push_back(static_cast<int>(item.whole));
  }
  return std::array<int, 3>{whole.front(), count == 2 ? 1 : whole[1], whole.back()};
}

bool also_csv(const Table& table, MeshKind kind) {
  bool csv = false;
  for (const auto& [word, at] : table.texts("also")) {
    if (word == "geotiff") table.document().fail(at, "'geotiff' is not in this version; leave it out");
    if (word != "csv") {
      const std::string nearest = text::nearest_word(word, {"csv", "geotiff"});
      table.document().fail(at, fmt::format("unknown form '{}'; {}", printable(word),
                                            nearest == "csv" ? "did you mean 'csv'?" : "expected csv"));
    }
    if (kind != MeshKind::catchments && kind != MeshKind::towns)
      table.document().fail(
          at, fmt::format("'csv' goes with mesh kinds catchments and towns, not '{}'; leave it out", kind_word(kind)));
    csv = true;
  }
  return csv;
}

// Units of projected axes: a length, or the angle of a geostationary scan.
void check_axis_units(const Table& table, const std::string& key) {
  check_units(table, key);
  const std::string written = table.text(key, "");
  if (written.empty()) return;
  for (const char* wanted : {"m", "radian"}) {
    try {
      (void)units::conversion(written, wanted, "", table.title());
      return;
    } catch (const Error&) {
      continue;
    }
  }
  table.fail(key, fmt::format("units '{}' are neither a length nor an angle; expected units such as m, km or radian",
                              printable(written)));
}

GridSpec read_grid(const Table& run) {
  GridSpec grid;
  const std::optional<Table> table = run.table("grid", "'grid' of [[run]]", kGridKeys);
  if (!table) return grid;
  grid.crs = table->text("crs", "");
  if (table->has("crs") && grid.crs.empty())
    table->fail("crs", "'crs' is empty; expected a projection PROJ knows, such as \"EPSG:3035\"");
  if (const auto pole = table->numbers("pole", 2)) {
    const double lon = (*pole)[0], lat = (*pole)[1];
    if (std::fabs(lon) > 360 || std::fabs(lat) > 90)
      table->fail("pole", fmt::format("'pole' is at longitude {}, latitude {}; expected [longitude, latitude] of the "
                                      "rotated north pole, within 360 and 90 degrees",
                                      lon, lat));
    if (!grid.crs.empty())
      table->fail("pole",
                  "'pole' stands beside 'crs'; expected 'pole' for a rotated grid or 'crs' for a projected one");
    grid.pole = {lon, lat};
  }
  check_axis_units(*table, "units");
  grid.axis_units = table->text("units", "");
  grid.coordinates = table->path("coordinates");
  const Words<std::string> sides{{{"great-circles", "great-circles"}, {"parallels", "parallels"}}, {}};
  grid.sides = table->word<std::string>("sides", sides, "");
  return grid;
}

}  // namespace

void check_name(const Table& table, const std::string& key, const std::string& name) {
  const auto good = [](unsigned char c) {
    return std::isalnum(c) != 0 || c == '.' || c == '_' || c == '+' || c == '-';
  };
  const bool fits = !name.empty() && name.size() <= 100 && std::all_of(name.begin(), name.end(), good) &&
                    std::isalnum(static_cast<unsigned char>(name.front())) != 0;
  if (!fits)
    table.fail(key, fmt::format("'{}' cannot be part of a file name; expected letters, digits, '.', '_', '+' or '-', "
                                "a letter or digit first",
                                printable(name)));
}

void read_job_table(const Table& table, JobSpec& job) {
  job.title = table.text("title", "");
  if (table.has("workspace")) job.workspace = table.path("workspace");
  job.memory_bytes = memory(table);
  job.threads = table.whole("threads", 0, 0, 4096);
  if (const auto settle = table.text("settle")) {
    const std::optional<double> seconds = text::parse_seconds(*settle);
    if (!seconds || *seconds < 0) table.fail("settle", "'settle' is no duration; expected one such as \"10 min\"");
    job.settle_s = *seconds;
  }
  if (const auto version = table.text("version")) {
    check_name(table, "version", *version);
    job.version = *version;
  }
}

RunSpec read_run(const Table& table) {
  RunSpec run;
  if (!table.has("files")) table.missing("files", "the model's NetCDF files, such as files = [\"tas_*.nc\"]");
  run.patterns = table.paths("files");
  run.name = table.text("name", "");
  if (table.has("name")) check_name(table, "name", run.name);
  run.family = table.text("family", "");
  if (table.has("family")) check_name(table, "family", run.family);
  run.anchor = table.flag("anchor").value_or(false);
  run.forcing = table.text("forcing", "");
  run.land_fraction = table.path("land_fraction");
  run.grid = read_grid(table);
  return run;
}

OutputSpec read_output(const Table& table, MeshKind kind) {
  OutputSpec output;
  if (table.has("directory")) output.directory = table.path("directory");
  output.name = table.text("name", output.name);
  check_output_name(table, output.name);
  table.word<int>("calendar", {{{"source", 0}}, {"standard", "365_day"}}, 0);
  output.deflate = table.word<bool>("compression", {{{"deflate", true}, {"none", false}}, {}}, true);
  output.level = output.deflate ? table.whole("level", 1, 0, 9) : 0;
  if (!output.deflate && table.whole("level", 0, 0, 9) != 0)
    table.fail("level", "'level' goes with compression \"deflate\"; expected 0 or no 'level' with \"none\"");
  output.digits = table.whole("digits", 0, 0, 7);
  output.tile = tile(table, kind);
  output.csv = also_csv(table, kind);
  output.attributes = table.text_table("attributes");
  for (const auto& [name, value] : output.attributes) {
    const bool fits = !name.empty() && std::all_of(name.begin(), name.end(), [](unsigned char c) {
      return std::isalnum(c) != 0 || c == '_';
    }) && std::isalpha(static_cast<unsigned char>(name.front())) != 0;
    if (!fits)
      table.fail(
          "attributes",
          fmt::format("'{}' is no attribute name; expected letters, digits and '_', a letter first", printable(name)));
  }
  return output;
}

}  // namespace windrow::job
