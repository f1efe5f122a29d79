// `windrow plan`: everything is read, nothing is written.
#include <fmt/format.h>

#include <algorithm>
#include <map>

#include "ensemble_make.h"
#include "stage_setup.h"
#include "windrow/report/facts.h"
#include "windrow/text/words.h"

namespace windrow::engine {
namespace {

using report::Fact;

// Rough share of deflated size, and rates of one thread: half of what tools/bench showed with two threads (274 and 84
// MB/s, the latter quantile mapping by month on a busy machine). They are told to people and decide nothing.
constexpr double kDeflatedShare = 0.6;
constexpr double kTileBytesPerSecond = 137e6;
constexpr double kColumnBytesPerSecond = 42e6;

struct Totals {
  double bytes = 0, seconds = 0;
  std::int64_t bound = 0;
  std::size_t wanted = 0, current = 0;
};

void add_stage(Session& session, const StageSetup& setup, Fact& fact, Totals& totals) {
  const auto& context = *setup.context;
  const auto& chunk = context.input.chunk;
  fact.add({"source grid", context.source.mesh->describe() + "; " + context.source.variable->grid().how});
  fact.add({"linear map", context.weights.map->provenance});
  fact.add({"pairings", static_cast<std::int64_t>(context.weights.map->pairings())});
  fact.add({"chunk [time, y, x]", fmt::format("{} x {} x {}", chunk.time, chunk.y, chunk.x)});
  fact.add({"units of work", static_cast<std::int64_t>(setup.stage.pieces)});
  fact.add({"threads", static_cast<std::int64_t>(setup.stage.threads)});
  fact.add({"memory bound", text::bytes_text(setup.stage.bound)});
  if (setup.calibration != nullptr) {
    fact.add({"stations", fmt::format("{} give the level, {} the shape", setup.calibration->carried.level_stations,
                                      setup.calibration->carried.shape_stations)});
  }
  totals.bound = std::max(totals.bound, setup.stage.bound);
  const double cells = static_cast<double>(context.target.ny * context.target.nx);
  double bytes = 0;
  for (const auto& product : context.products) {
    if (product.span.wanted) bytes += cells * static_cast<double>(product.span.t1 - product.span.t0) * sizeof(float);
  }
  totals.bytes += bytes;
  const double rate = session.adjusted(context.field) ? kColumnBytesPerSecond : kTileBytesPerSecond;
  totals.seconds += bytes / rate / setup.stage.threads;
}

void add_products(const std::vector<Product>& products, const std::string& folder, Fact& fact, Totals& totals) {
  std::map<std::string, std::vector<const Product*>> by_reason;
  for (const auto& product : products) {
    by_reason[product.stale].push_back(&product);
    ++(product.stale.empty() ? totals.current : totals.wanted);
  }
  for (const auto& [reason, list] : by_reason) {
    std::string names = told_path(list.front()->path, folder);
    if (list.size() > 1) names += fmt::format(" to {}", told_path(list.back()->path, folder));
    fact.add({reason.empty() ? "up to date" : "to make",
              fmt::format("{} ({}){}", list.size(), names, reason.empty() ? "" : ": " + reason)});
  }
}

/// Products of [ensemble], and what of them cannot be made or is left out.
void add_ensemble(Session& session, const RunProducts& runs, Fact& root, Totals& totals) {
  const auto plan = plan_ensemble(session, runs);
  for (const auto& stage : plan.stages) {
    Fact& fact = root.add(Fact(stage.name));
    const auto& products = stage.result.products;
    add_products(products, session.folder(), fact, totals);
    double bytes = 0;
    const double cells = static_cast<double>(session.target().mesh->size());
    for (const auto& product : products) {
      if (product.span.wanted) bytes += cells * static_cast<double>(product.span.t1 - product.span.t0) * sizeof(float);
    }
    if (bytes == 0) continue;
    const auto needs = ensemble_needs(session, stage);
    fact.add({"chunk [time, y, x]", fmt::format("{} x {} x {}", needs.chunk.time, needs.chunk.y, needs.chunk.x)});
    fact.add({"threads", static_cast<std::int64_t>(needs.threads)});
    fact.add({"memory bound", text::bytes_text(needs.bound)});
    totals.bound = std::max(totals.bound, needs.bound);
    totals.bytes += bytes;
    totals.seconds += bytes / kTileBytesPerSecond / needs.threads;
  }
  for (const auto& [name, reason, kind] : plan.failed) root.add(Fact(name)).add({"cannot be made", reason});
  for (const auto& notice : plan.notices) root.add(Fact(notice.place)).add({"note", notice.text});
}

}  // namespace

Report plan(const std::string& job_file, const Options& options) {
  Session session(job_file, options);
  session.write_nothing();
  SharedFits fits;
  Fact root("plan");
  Totals totals;
  Fact& mesh = root.add(Fact("mesh"));
  mesh.add({"cells", fmt::format("{}; {}", session.target().mesh->describe(), session.job.mesh.name)});
  const geo::Crs& crs = session.target().crs;
  mesh.add({"crs", crs.name == "unknown" ? crs.grid_mapping.name : crs.name});
  for (const auto& notice : session.target().notices) {
    mesh.add({"note", fmt::format("{}: {}", told_path(notice.place, session.folder()), notice.text)});
  }
  RunProducts runs;
  for (std::size_t field = 0; field < session.job.fields.size(); ++field) {
    for (std::size_t run = 0; run < session.job.runs.size(); ++run) {
      Fact& fact = root.add(Fact(fmt::format("{} of {}", session.job.fields[field].name, session.job.runs[run].name)));
      const auto products = session.products(field, run);
      runs[{field, run}] = products;
      add_products(products, session.folder(), fact, totals);
      const bool wanted = std::any_of(products.begin(), products.end(), [](const Product& p) { return p.span.wanted; });
      if (!wanted) continue;
      Notices notices;
      const auto setup = set_up(session, fits, field, run, products, notices);
      add_stage(session, *setup, fact, totals);
      for (const auto& notice : setup->context->notices) {
        fact.add({"note", fmt::format("{}: {}", told_path(notice.place, session.folder()), notice.text)});
      }
    }
  }
  add_ensemble(session, runs, root, totals);
  Fact& sum = root.add(Fact("in all"));
  sum.add({"products to make", static_cast<std::int64_t>(totals.wanted)});
  sum.add({"products up to date", static_cast<std::int64_t>(totals.current)});
  sum.add({"memory", fmt::format("at most {} of a ceiling of {}", text::bytes_text(totals.bound),
                                 text::bytes_text(memory_ceiling(session.job)))});
  sum.add({"disk", fmt::format("about {} while running, {} when done",
                               text::bytes_text(static_cast<std::int64_t>(2 * kDeflatedShare * totals.bytes)),
                               text::bytes_text(static_cast<std::int64_t>(kDeflatedShare * totals.bytes)))});
  sum.add({"time", fmt::format("about {:.0f} s", totals.seconds)});
  Fact& settings = root.add(Fact("settings"));
  for (const auto& [name, value] : job::settings(session.job, false)) settings.add({name, value});
  return {report::to_text(root), report::to_json(root)};
}

}  // namespace windrow::engine
