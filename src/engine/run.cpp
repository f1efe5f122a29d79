// `windrow run`: stages in job order, one field of one run at a time.
#include <fmt/format.h>

#include <algorithm>
#include <mutex>

#include "ensemble_make.h"
#include "make_deps.h"
#include "stage_setup.h"
#include "windrow/os/process.h"

namespace windrow::engine {
namespace {

/// Adds up bytes from all workers and hands them on, one call at a time.
class Progress {
 public:
  explicit Progress(const ProgressSink& sink) : sink_(sink) {}
  void total(double bytes, std::size_t products) {
    state_.total_bytes = bytes;
    state_.products_total = products;
  }
  void phase(const std::string& name) {
    const std::lock_guard lock(mutex_);
    state_.phase = name;
    if (sink_) sink_(state_);
  }
  void bytes(std::int64_t count) {
    const std::lock_guard lock(mutex_);
    state_.done_bytes += static_cast<double>(count);
    if (sink_) sink_(state_);
  }
  void product() {
    const std::lock_guard lock(mutex_);
    ++state_.products_done;
    if (sink_) sink_(state_);
  }

 private:
  const ProgressSink& sink_;
  std::mutex mutex_;
  ProgressState state_;
};

double product_bytes(Session& session, const Product& product) {
  const auto cells = static_cast<double>(session.target().mesh->size());
  return cells * static_cast<double>(product.span.t1 - product.span.t0) * sizeof(float);
}

bool any_wanted(const std::vector<Product>& products) {
  return std::any_of(products.begin(), products.end(), [](const Product& p) { return !p.stale.empty(); });
}

struct StageJob {
  std::size_t field, run;
  std::vector<Product> products;
};

class Runner {
 public:
  Runner(Session& session, const ProgressSink& progress, const EventSink& events)
      : session_(session), progress_(progress), events_(events) {}

  Summary run();

 private:
  void collect();
  void collect_ensemble();
  void list(const std::vector<Product>& products);
  void make(EnsembleStage& stage);
  void check_space();
  void make(StageJob& stage);
  void make_unguarded(StageJob& stage, Notices& notices);
  void fail(const std::vector<Product>& products, const Error& error);
  void made(const Product& product);
  [[nodiscard]] std::vector<const std::vector<Product>*> all_products() const;
  void event(const std::string& kind, const std::string& text) {
    const std::lock_guard lock(events_mutex_);
    if (events_) events_({kind, text});
  }
  [[nodiscard]] std::size_t index_of(const std::string& path) const;

  Session& session_;
  Progress progress_;
  const EventSink& events_;
  std::mutex events_mutex_;
  SharedFits fits_;
  std::vector<StageJob> stages_;
  std::vector<EnsembleStage> ensemble_;
  Notices notices_;
  Summary summary_;
};

std::size_t Runner::index_of(const std::string& path) const {
  std::size_t i = 0;
  while (summary_.products[i].path != path) ++i;
  return i;
}

/// Lists all products of all fields and runs; a field whose inputs cannot be read fails without stopping the others.
void Runner::collect() {
  for (std::size_t field = 0; field < session_.job.fields.size(); ++field) {
    for (std::size_t run = 0; run < session_.job.runs.size(); ++run) {
      StageJob stage{field, run, {}};
      try {
        stage.products = session_.products(field, run);
      } catch (const Error& error) {
        if (error.kind() == Failure::interrupted) throw;
        const auto name = fmt::format("{} of {}", session_.job.fields[field].name, session_.job.runs[run].name);
        summary_.products.push_back({name, State::failed, error.what()});
        if (!summary_.failure) summary_.failure = error.kind();
        continue;
      }
      list(stage.products);
      stages_.push_back(std::move(stage));
    }
  }
  collect_ensemble();
}

void Runner::list(const std::vector<Product>& products) {
  for (const auto& product : products) {
    const bool current = product.stale.empty();
    summary_.products.push_back(
        {product.path, current ? State::current : State::failed, current ? "up to date" : "not reached"});
  }
}

/// Lists the products of [ensemble] behind those of the runs.
void Runner::collect_ensemble() {
  RunProducts runs;
  for (const auto& stage : stages_) runs[{stage.field, stage.run}] = stage.products;
  auto plan = plan_ensemble(session_, runs);
  for (const auto& stage : plan.stages) list(stage.result.products);
  for (const auto& [name, reason, kind] : plan.failed) {
    summary_.products.push_back({name, State::failed, reason});
    if (!summary_.failure) summary_.failure = kind;
  }
  ensemble_ = std::move(plan.stages);
  // With nothing to make there is nothing to tell.
  const bool wanted = std::any_of(ensemble_.begin(), ensemble_.end(),
                                  [](const EnsembleStage& stage) { return any_wanted(stage.result.products); });
  if (!wanted) return;
  for (const auto& notice : plan.notices) notices_.add(notice.place, notice.text);
}

std::vector<const std::vector<Product>*> Runner::all_products() const {
  std::vector<const std::vector<Product>*> out;
  for (const auto& stage : stages_) out.push_back(&stage.products);
  for (const auto& stage : ensemble_) out.push_back(&stage.result.products);
  return out;
}

/// Refuses what cannot fit at all: a deflated product is never below a twentieth of its values, and spool and product
/// stand side by side.
void Runner::check_space() {
  double bytes = 0;
  std::size_t wanted = 0;
  for (const auto* products : all_products()) {
    for (const auto& product : *products) {
      if (product.stale.empty()) continue;
      bytes += product_bytes(session_, product);
      ++wanted;
    }
  }
  progress_.total(bytes, wanted);
  if (wanted == 0) return;
  os::make_folder(session_.job.output.directory);
  os::sweep_temporaries(session_.job.output.directory);
  constexpr double kLeastShare = 0.05;
  const auto free = static_cast<double>(os::free_bytes(session_.job.output.directory));
  if (bytes * kLeastShare * 2 > free) {
    throw Error(Failure::output, session_.job.output.directory,
                fmt::format("too little space: {:.1f} MB are free, the products hold {:.1f} MB before compression",
                            free / 1e6, bytes / 1e6));
  }
}

void Runner::fail(const std::vector<Product>& products, const Error& error) {
  if (!summary_.failure) summary_.failure = error.kind();
  for (const auto& product : products) {
    auto& status = summary_.products[index_of(product.path)];
    if (status.state == State::failed) status.reason = error.what();
  }
}

void Runner::make(StageJob& stage) {
  Notices notices;
  try {
    make_unguarded(stage, notices);
  } catch (const Error& error) {
    if (error.kind() == Failure::interrupted) throw;
    event("failed", error.what());
    fail(stage.products, error);
  }
  // Of a stage that failed they may say why.
  for (const auto& notice : session_.notices(stage.field, stage.run)) notices_.add(notice.place, notice.text);
  for (const auto& notice : notices.list()) notices_.add(notice.place, notice.text);
}

void Runner::make_unguarded(StageJob& stage, Notices& notices) {
  const auto& job = session_.job;
  const std::string name =
      fmt::format("{}-{}-{}", job.fields[stage.field].name, job.runs[stage.run].name, job.mesh.name);
  progress_.phase(fmt::format("{} of {}", job.fields[stage.field].name, job.runs[stage.run].name));
  const auto setup = set_up(session_, fits_, stage.field, stage.run, stage.products, notices);
  auto& context = *setup->context;
  pipeline::Spool spool(fmt::format("{}/{}.spool", job.workspace, name));
  std::vector<codec::Digest> keys;
  for (const auto& product : context.products) keys.push_back(product.key_digest);
  spool.keep_for(keys);
  pipeline::StageHooks hooks;
  hooks.progress = [this](std::int64_t bytes) { progress_.bytes(bytes); };
  hooks.stop = os::stop_requested;
  hooks.finish = [&](std::size_t index) {
    assemble(context, index, spool);
    made(context.products[index]);
  };
  pipeline::run_stage(context.input, setup->stage, *setup->run_readers.top(), setup->anchor_readers.top(), spool,
                      hooks);
  spool.remove();
}

void Runner::made(const Product& product) {
  {
    const std::lock_guard lock(events_mutex_);
    auto& status = summary_.products[index_of(product.path)];
    status = {product.path, State::made, product.stale};
    summary_.output_bytes += product_bytes(session_, product);
  }
  progress_.product();
  event("made", fmt::format("{} ({})", product.path, product.stale));
}

void Runner::make(EnsembleStage& stage) {
  progress_.phase(stage.name);
  EnsembleHooks hooks;
  hooks.finished = [&](std::size_t index) { made(stage.result.products[index]); };
  hooks.progress = [this](std::int64_t bytes) { progress_.bytes(bytes); };
  hooks.stop = os::stop_requested;
  try {
    make_ensemble(session_, stage, hooks);
  } catch (const Error& error) {
    if (error.kind() == Failure::interrupted) throw;
    event("failed", error.what());
    fail(stage.result.products, error);
  }
}

Summary Runner::run() {
  const double start = os::monotonic_seconds();
  collect();
  const auto all = all_products();
  const bool wanted = std::any_of(all.begin(), all.end(), [](const auto* products) { return any_wanted(*products); });
  if (!session_.options.make_deps.empty()) {
    std::vector<Product> listed;
    for (const auto* products : all) listed.insert(listed.end(), products->begin(), products->end());
    write_make_deps(session_.options.make_deps, listed, session_.job.path);
  }
  if (wanted) {
    // Without its mesh nothing of the job can be made.
    for (const auto& notice : session_.target().notices) notices_.add(notice.place, notice.text);
    os::make_folder(session_.job.workspace);
    const os::Lease lease(session_.job.workspace, session_.options.wait_s);
    session_.digests().save();
    check_space();
    for (auto& stage : stages_) {
      if (!any_wanted(stage.products)) continue;
      lease.confirm();
      make(stage);
    }
    for (auto& stage : ensemble_) {
      if (!any_wanted(stage.result.products)) continue;
      lease.confirm();
      make(stage);
    }
    session_.digests().save();
  }
  summary_.notices = notices_.list();
  summary_.seconds = os::monotonic_seconds() - start;
  summary_.peak_memory = os::peak_memory();
  return summary_;
}

}  // namespace

Summary run(const std::string& job_file, const Options& options, const ProgressSink& progress,
            const EventSink& events) {
  Session session(job_file, options);
  session.wait_until_settled();
  return Runner(session, progress, events).run();
}

}  // namespace windrow::engine
