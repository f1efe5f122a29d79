// parse_job(): reads the tables in order, then checks what concerns several of them.
#include <fmt/format.h>

#include "checks.h"
#include "paths.h"
#include "sections.h"
#include "tree.h"

namespace windrow::job {
namespace {

// The tables of [[key]], at least one.
std::vector<Table> table_list(const Table& root, const std::string& key, const Keys& keys,
                              const std::string& expected) {
  const Value* value = root.find(key);
  const std::string title = "[[" + key + "]]";
  if (value == nullptr || (value->kind == Value::Kind::array && value->items.empty()))
    root.document().fail(value == nullptr ? Position{} : value->at,
                         fmt::format("the job has no {}; expected {}", title, expected));
  if (value->kind == Value::Kind::table)
    root.document().fail(value->at, fmt::format("[{}] is one table; expected {}, as there may be several", key, title));
  if (value->kind != Value::Kind::array) root.wrong_kind(key, *value, "tables " + title);
  std::vector<Table> out;
  for (const Value& item : value->items) {
    if (item.kind != Value::Kind::table)
      root.document().fail(item.at,
                           fmt::format("an entry of '{}' is {}; expected tables {}", key, kind_name(item), title));
    out.emplace_back(root.document(), item, title, keys);
  }
  return out;
}

}  // namespace

JobSpec parse_job(const std::string& path, const std::string& text, const std::vector<std::string>& overrides) {
  const Document document(path, text, overrides);
  Value tree = read_toml(document);
  apply_overrides(document, tree);
  const Table root(document, tree, "the job file", kRootKeys);

  JobSpec job;
  job.path = absolute_job_path(path);
  job.text = text;
  job.workspace = expanded_path(document, "work", {}, "workspace");
  job.output.directory = expanded_path(document, "out", {}, "directory");
  if (const auto table = root.table("job", "[job]", kJobKeys)) read_job_table(*table, job);

  Tables tables;
  tables.runs = table_list(root, "run", kRunKeys, "a table [[run]] with 'files'");
  for (const Table& table : tables.runs) job.runs.push_back(read_run(table));
  tables.fields = table_list(root, "field", kFieldKeys, "a table [[field]] with 'variable'");
  for (const Table& table : tables.fields) job.fields.push_back(read_field(table));
  const auto mesh = root.table("mesh", "[mesh]", kMeshKeys);
  if (!mesh) document.fail({}, "the job has no [mesh]; expected a table [mesh] with 'lon' and 'lat'");
  job.mesh = read_mesh(*mesh);
  if (const auto table = root.table("stations", "[stations]", kStationKeys)) job.stations = read_stations(*table);
  if (const auto table = root.table("reach", "[reach]", kReachKeys)) job.reach = read_reach(*table);
  tables.ensemble = root.table("ensemble", "[ensemble]", kEnsembleKeys);
  tables.output = root.table("output", "[output]", kOutputKeys);
  if (tables.output) {
    const std::string directory = job.output.directory;
    job.output = read_output(*tables.output, job.mesh.kind);
    if (job.output.directory.empty()) job.output.directory = directory;
  }

  settle_runs(tables, job);
  if (tables.ensemble) job.ensemble = read_ensemble(*tables.ensemble, job);
  check_fields(tables, job);
  check_methods(tables, job);
  check_pairs(tables, job);
  check_products(document, tables, job);
  check_ensemble(document, tables, job);
  return job;
}

}  // namespace windrow::job
