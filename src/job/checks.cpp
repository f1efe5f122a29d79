#include "checks.h"

#include <fmt/format.h>

#include <algorithm>
#include <map>

#include "windrow/text/words.h"

namespace windrow::job {
namespace {

void check_anchors(const Tables& tables, JobSpec& job) {
  std::map<std::string, std::vector<std::size_t>> families;
  for (std::size_t i = 0; i < job.runs.size(); ++i) families[job.runs[i].family].push_back(i);
  for (const auto& [family, members] : families) {
    if (members.size() == 1) {
      job.runs[members.front()].anchor = true;
      continue;
    }
    std::vector<std::string> names, anchors;
    std::size_t last = members.front();
    for (const std::size_t i : members) {
      names.push_back(job.runs[i].name);
      if (job.runs[i].anchor) {
        anchors.push_back(job.runs[i].name);
        last = i;
      }
    }
    if (anchors.empty())
      tables.runs[members.back()].fail(
          "family", fmt::format("family '{}' has no anchor run; expected anchor = true in {}", family,
                                text::alternatives(names)));
    if (anchors.size() > 1)
      tables.runs[last].fail("anchor", fmt::format("family '{}' has {} anchor runs; expected anchor = true only in {}",
                                                   family, anchors.size(), text::alternatives(anchors)));
  }
}

}  // namespace

void settle_runs(const Tables& tables, JobSpec& job) {
  for (std::size_t i = 0; i < job.runs.size(); ++i) {
    RunSpec& run = job.runs[i];
    if (run.name.empty()) {
      if (job.runs.size() > 1) tables.runs[i].missing("name", "a name, as the job has several runs");
      run.name = "run";
    }
    for (std::size_t k = 0; k < i; ++k)
      if (job.runs[k].name == run.name)
        tables.runs[i].fail("name", fmt::format("two runs are called '{}'; expected names of their own", run.name));
    if (run.family.empty()) run.family = run.name;
  }
  check_anchors(tables, job);
}

void check_fields(const Tables& tables, const JobSpec& job) {
  for (std::size_t i = 0; i < job.fields.size(); ++i) {
    const FieldSpec& field = job.fields[i];
    const Table& table = tables.fields[i];
    for (std::size_t k = 0; k < i; ++k)
      if (job.fields[k].name == field.name)
        table.fail(table.has("name") ? "name" : "variable",
                   fmt::format("two fields are called '{}'; expected a 'name' of its own for each", field.name));
    if (field.adjust.method != Adjustment::none && !job.stations.given)
      table.fail("adjust", "[field.adjust] needs observations; expected a table [stations]");
    // Towns bring the elevations of their table of sites.
    if (field.terrain && job.mesh.height.empty() && job.mesh.kind != MeshKind::towns)
      table.fail("terrain", "[field.terrain] needs the mesh's heights; expected 'height' in [mesh]");
    if (field.adjust.method != Adjustment::none && job.reach.method == ReachMethod::kriging_height &&
        job.mesh.height.empty() && job.mesh.kind != MeshKind::towns)
      table.fail("adjust", "reach method \"kriging-height\" needs the mesh's heights; expected 'height' in [mesh]");
    const bool land =
        std::any_of(job.runs.begin(), job.runs.end(), [](const RunSpec& run) { return !run.land_fraction.empty(); });
    if (field.min_land > 0 && !land)
      table.fail("min_land", "'min_land' needs land fractions; expected 'land_fraction' in a [[run]]");
  }
}

void check_products(const Document& document, const Tables& tables, const JobSpec& job) {
  const Position at = tables.output ? tables.output->at("name") : Position{};
  std::map<std::string, std::string> makers;
  for (const FieldSpec& field : job.fields) {
    for (const RunSpec& run : job.runs) {
      const std::string maker = fmt::format("field '{}' of run '{}'", field.name, run.name);
      const std::string name = product_name(job, field, run);
      const auto [known, added] = makers.emplace(name, maker);
      if (added) continue;
      std::string wanted;
      if (job.fields.size() > 1 && job.output.name.find("{field}") == std::string::npos) wanted = "{field}";
      if (job.runs.size() > 1 && job.output.name.find("{run}") == std::string::npos)
        wanted += wanted.empty() ? "{run}" : " and {run}";
      document.fail(at,
                    fmt::format("{} and {} would both be '{}'; expected {} in 'name' of [output]", known->second, maker,
                                printable(name), wanted.empty() ? "a separator between the placeholders" : wanted));
    }
  }
}

}  // namespace windrow::job
