#include "session.h"

#include <fmt/format.h>

#include <algorithm>

#include "calibration.h"
#include "table.h"
#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/report/ledger.h"

namespace windrow::engine {
namespace {

// Raised whenever the same job and inputs give other values or another file layout.
constexpr const char* kProductFormat = "windrow product, format 1, version " WINDROW_VERSION;

plan::Found find_product(const Product& product, bool table) {
  plan::Found found;
  const auto state = os::state(product.path);
  if (!state) return found;
  found.product = true;
  if (!os::state(product.ledger_path) || (table && !os::state(table_path(product.path)))) return found;
  try {
    const auto ledger = report::parse_ledger(os::read_text(product.ledger_path), product.ledger_path);
    found.product = ledger.product_bytes == state->size;
    found.key.emplace();
    for (const auto& [name, hex] : ledger.key) found.key->parts.emplace_back(name, codec::Digest::from_hex(hex));
  } catch (const Error&) {
    // A damaged ledger is no evidence: the product is made again.
    found.key.reset();
  }
  return found;
}

}  // namespace

std::string ledger_path(const std::string& product_path) {
  const bool netcdf = product_path.ends_with(".nc");
  return (netcdf ? product_path.substr(0, product_path.size() - 3) : product_path) + ".ledger.json";
}

codec::Digest digest_of(const plan::Key& key) {
  codec::Hasher hasher;
  for (const auto& [name, digest] : key.parts) hasher.add(name).add(digest.hex());
  return hasher.finish();
}

Session::Session(const std::string& job_file, const Options& given)
    : job(job::parse_job(os::absolute(job_file, "."), os::read_text(job_file), given.overrides)),
      options(given),
      folder_(os::folder_of(job.path)) {
  for (const auto& run : job.runs) files_.push_back(run_files(run));
  digests_ = std::make_unique<DigestCache>(job.workspace + "/digests.txt", options.reread);
  maps_ = std::make_unique<MapStore>(job.workspace + "/maps");
}

void Session::write_nothing() {
  maps_ = std::make_unique<MapStore>("");
  writes_ = false;
}

plan::Key Session::key_head(const std::vector<std::pair<std::string, std::string>>& settings) {
  plan::Key key;
  key.parts.emplace_back("program", codec::digest(std::string(kProductFormat)));
  codec::Hasher hasher;
  for (const auto& [name, value] : settings) hasher.add(name).add(value);
  key.parts.emplace_back("settings", hasher.finish());
  return key;
}

void Session::judge(Product& product) const {
  product.key_digest = digest_of(product.key);
  product.stale = plan::why_stale(find_product(product, job.output.csv), product.key);
  product.span.wanted = !product.stale.empty();
}

const Target& Session::target() {
  if (!target_) target_ = make_target(job, *maps_);
  return *target_;
}

Session::Opened& Session::opened(std::size_t field, std::size_t run) {
  Opened& found = sources_[{run, job.fields[field].variable}];
  if (!found.source.variable) {
    found.source.variable =
        cf::open_run(files_[run], job.fields[field].variable, found.notices, hints_of(job.runs[run].grid));
  }
  return found;
}

const cf::RunVariable& Session::variable(std::size_t field, std::size_t run) {
  return *opened(field, run).source.variable;
}

const Source& Session::source(std::size_t field, std::size_t run) {
  Opened& found = opened(field, run);
  Source& source = found.source;
  if (!source.mesh) {
    source.mesh = mesh_of(source.variable->grid(), target().earth, files_[run].front(), found.notices).mesh;
  }
  return source;
}

std::optional<std::size_t> Session::partner_of(std::size_t field) const {
  const auto pair = job.fields[field].pair;
  for (std::size_t k = 0; pair != job::Pair::none && k < job.fields.size(); ++k) {
    if (job.fields[k].pair != job::Pair::none && job.fields[k].pair != pair) return k;
  }
  return {};
}

std::vector<Notice> Session::notices(std::size_t field, std::size_t run) { return opened(field, run).notices.list(); }

std::size_t Session::anchor_of(std::size_t run) const {
  for (std::size_t i = 0; i < job.runs.size(); ++i) {
    if (job.runs[i].family == job.runs[run].family && job.runs[i].anchor) return i;
  }
  return run;
}

std::string Session::height_path(std::size_t field, std::size_t run) const {
  const auto& terrain = job.fields[field].terrain;
  return terrain ? for_run(terrain->model_height, job.runs[run]) : std::string();
}

std::string Session::product_path(std::size_t field, std::size_t run, int year) const {
  const std::string name = job::product_name(job, job.fields[field], job.runs[run]);
  return job.output.directory + "/" + with_value(name, "{year}", fmt::format("{:04d}", year));
}

plan::Key Session::key_of(std::size_t field, std::size_t run, const plan::ProductSpan& span,
                          std::vector<std::string>& inputs) {
  const auto& spec = job.runs[run];
  const bool whole = adjusted(field);
  for (const auto& part : variable(field, run).files()) {
    if (whole || (part.first < span.t1 && part.first + part.count > span.t0)) inputs.push_back(part.path);
  }
  const auto add = [&inputs](const std::string& path) {
    if (!path.empty()) inputs.push_back(path);
  };
  add(spec.land_fraction);
  add(spec.grid.coordinates);
  for (const auto& path : mesh_files(job.mesh)) add(path);
  if (whole) {
    const std::size_t anchor = anchor_of(run);
    if (anchor != run) {
      for (const auto& path : files_[anchor]) add(path);
      add(job.runs[anchor].land_fraction);
      add(height_path(field, anchor));
    }
    add(height_path(field, run));
    if (job.fields[field].terrain) add(job.mesh.height);
    add(job.stations.sites);
    for (const auto* list : {&job.stations.daily, &job.stations.monthly, &job.stations.normals}) {
      for (const auto& path : *list) add(path);
    }
  }
  std::sort(inputs.begin(), inputs.end());
  inputs.erase(std::unique(inputs.begin(), inputs.end()), inputs.end());
  plan::Key key = key_head(job::product_settings(job, field, run, job::Effect::encoding));
  for (const auto& path : inputs) key.parts.emplace_back(told_path(path, folder_), digests_->of(path));
  return key;
}

std::vector<Product> Session::products(std::size_t field, std::size_t run) {
  const auto dates = step_dates(variable(field, run));
  const bool by_year = job.output.name.find("{year}") != std::string::npos;
  std::vector<Product> out;
  for (std::size_t t = 0; t < dates.size();) {
    std::size_t end = t + 1;
    while (end < dates.size() && (!by_year || dates[end].year == dates[t].year)) ++end;
    Product product;
    product.field = field;
    product.run = run;
    product.path = product_path(field, run, dates[t].year);
    product.ledger_path = ledger_path(product.path);
    product.span = {t, end, true};
    product.key = key_of(field, run, product.span, product.inputs);
    judge(product);
    out.push_back(std::move(product));
    t = end;
  }
  return out;
}

}  // namespace windrow::engine
