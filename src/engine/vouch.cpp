// `windrow vouch`: a finished product is looked at again, on its own and against its ledger.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "inputs.h"
#include "windrow/base/error.h"
#include "windrow/base/exact_sum.h"
#include "windrow/cf/product.h"
#include "windrow/codec/codec.h"
#include "windrow/engine/engine.h"
#include "windrow/report/ledger.h"

namespace windrow::engine {
namespace {

// Conservation that the double results must keep; see DEVELOPERS.md, "Conservation".
constexpr double kBalanceBound = 1e-13;

class Voucher {
 public:
  explicit Voucher(const std::string& path) : path_(path), reader_(cf::open_product(path)) {
    out_.product = path;
    const std::string stem = path.ends_with(".nc") ? path.substr(0, path.size() - 3) : path;
    ledger_path_ = stem + ".ledger.json";
  }
  Vouched vouch();

 private:
  void check(const std::string& name, bool good, const std::string& text) {
    out_.checks.push_back({name, good ? Verdict::passed : Verdict::failed, text});
  }
  void check_ledger();
  void check_structure();
  void check_axis(const std::string& name);
  void check_values();
  void check_balance();
  [[nodiscard]] bool has(const std::string& name) const {
    return std::find(variables_.begin(), variables_.end(), name) != variables_.end();
  }
  [[nodiscard]] std::string text(const std::string& variable, const std::string& attribute) const {
    const auto list = variable.empty() ? reader_->global_attributes() : reader_->attributes(variable);
    for (const auto& entry : list) {
      if (entry.name == attribute) return entry.text;
    }
    return {};
  }

  std::string path_, ledger_path_;
  std::unique_ptr<cf::ProductReader> reader_;
  std::vector<std::string> variables_;
  std::optional<report::Ledger> ledger_;
  std::string field_;
  Vouched out_;
};

void Voucher::check_ledger() {
  if (!os::state(ledger_path_)) {
    check("ledger", false, "missing: " + ledger_path_);
    return;
  }
  ledger_ = report::parse_ledger(os::read_text(ledger_path_), ledger_path_);
  check("ledger", ledger_->product == os::file_name_of(path_),
        fmt::format("belongs to {}, windrow {}", ledger_->product, ledger_->version));
  const auto digest = digest_file(path_).hex();
  check("digest", digest == ledger_->product_digest,
        digest == ledger_->product_digest ? "bytes are those the ledger states"
                                          : "the file was changed after it was made");
}

/// Strictly monotonic, bounds around every value, neighbours share bounds (CF 7.1).
void Voucher::check_axis(const std::string& name) {
  const auto values = reader_->values(name);
  // CF 7.4: a climatological time has climatology bounds, which overlap from month to month.
  const auto climatology = text(name, "climatology");
  const std::string bounds_name = climatology.empty() ? name + "_bnds" : climatology;
  if (!has(bounds_name)) {
    check("axis " + name, false, "has no bounds");
    return;
  }
  const auto bounds = reader_->values(bounds_name);
  bool good = bounds.size() == 2 * values.size();
  for (std::size_t i = 0; good && i < values.size(); ++i) {
    good = bounds[2 * i] <= values[i] && values[i] <= bounds[2 * i + 1];
    if (i > 0) good = good && values[i] > values[i - 1];
    if (i > 0 && name != "time") good = good && bounds[2 * i] == bounds[2 * i - 1];
  }
  check("axis " + name, good, fmt::format("{} values, ascending, inside their bounds", values.size()));
}

void Voucher::check_structure() {
  const std::string conventions = text("", "Conventions");
  check("conventions", conventions.find("CF-1.13") != std::string::npos, conventions);
  for (const char* name : {"time", "lat", "lon", "y", "x", "rlat", "rlon"}) {
    if (!has(name)) continue;
    const auto dimensions = reader_->dimensions(name);
    if (dimensions.size() == 1 && dimensions.front().name == name) check_axis(name);
  }
  std::vector<std::string> wanted{"crs", "status_flag"};
  if (text("", "windrow_ensemble").empty()) wanted.emplace_back("cover");  // that of its members stands in them
  if (text("", "featureType").empty()) wanted.emplace_back("cell_area");  // points have no area
  std::string missing, all;
  for (const std::string& name : wanted) {
    all += (all.empty() ? "" : ", ") + name;
    if (!has(name)) missing += (missing.empty() ? "" : ", ") + name;
  }
  check("companions", missing.empty(), missing.empty() ? all : "missing: " + missing);
  const auto units = text(field_, "units");
  check("data variable",
        !units.empty() && text(field_, "grid_mapping") == "crs" && !text(field_, "cell_methods").empty(),
        fmt::format("{} [{}], {}", field_, units, text(field_, "cell_methods")));
}

void Voucher::check_values() {
  const auto dimensions = reader_->dimensions(field_);
  const bool timed = !dimensions.empty() && dimensions.front().name == "time";
  const std::size_t steps = timed ? dimensions.front().length : 1;
  float missing = 9.96920997e36F;
  for (const auto& attribute : reader_->attributes(field_)) {
    if (attribute.name == "_FillValue" && !attribute.numbers.empty())
      missing = static_cast<float>(attribute.numbers[0]);
  }
  codec::Hasher hasher;
  std::vector<float> values;
  std::int64_t missing_count = 0, total = 0, bad = 0;
  float low = 3.4e38F, high = -3.4e38F;
  for (std::size_t t = 0; t < steps; ++t) {
    reader_->read_steps(field_, t, t + 1, values);
    hasher.add(std::as_bytes(std::span<const float>(values)));
    total += static_cast<std::int64_t>(values.size());
    for (const float x : values) {
      if (x == missing) {
        ++missing_count;
        continue;
      }
      bad += std::isfinite(x) ? 0 : 1;
      low = std::min(low, x);
      high = std::max(high, x);
    }
  }
  out_.value_digest = hasher.finish().hex();
  check("finite", bad == 0, fmt::format("{} of {} values are neither finite nor missing", bad, total));
  if (!ledger_) return;
  for (const auto& [name, count] : ledger_->counts) {
    if (name == "missing")
      check("missing", count == missing_count, fmt::format("{} in the file, {} in the ledger", missing_count, count));
  }
  if (missing_count < total) {
    const bool same = static_cast<double>(low) == ledger_->minimum && static_cast<double>(high) == ledger_->maximum;
    check("extremes", same,
          fmt::format("{} to {} in the file, {} to {} in the ledger", low, high, ledger_->minimum, ledger_->maximum));
  }
  for (const auto& [name, value] : ledger_->settings) {
    const auto to = value.find(" to ");
    if (name != "field.range" || to == std::string::npos || missing_count == total) continue;
    const double least = std::stod(value.substr(0, to)), most = std::stod(value.substr(to + 4));
    check("physical range", low >= static_cast<float>(least) && high <= static_cast<float>(most),
          fmt::format("{} to {} within {}", low, high, value));
  }
}

void Voucher::check_balance() {
  if (!ledger_) return;
  const auto& all = ledger_->balance.all;
  if (!ledger_->balance.kept) {
    out_.checks.push_back({"conservation", Verdict::passed, "not promised: " + ledger_->balance.statement});
    return;
  }
  check("conservation", all.relative <= kBalanceBound,
        fmt::format("largest residual of a step {:.2e} of the integral, bound {:.0e}, as the ledger states",
                    all.relative, kBalanceBound));
  out_.checks.push_back({"conservation anew", Verdict::needs_inputs, "the source integral needs the model files"});
  out_.checks.push_back(
      {"inputs", Verdict::needs_inputs, fmt::format("{} digests are in the ledger", ledger_->inputs.size())});
}

Vouched Voucher::vouch() {
  variables_ = reader_->variables();
  check_ledger();
  for (const auto& name : variables_) {
    if (!text(name, "ancillary_variables").empty()) field_ = name;
  }
  if (field_.empty()) {
    check("data variable", false, "no variable names ancillary variables: not a product of windrow");
    return out_;
  }
  check_structure();
  check_values();
  check_balance();
  return out_;
}

}  // namespace

bool Vouched::holds() const {
  return std::none_of(checks.begin(), checks.end(), [](const Check& c) { return c.verdict == Verdict::failed; });
}

Vouched vouch(const std::string& product) {
  if (!os::state(product)) throw Error(Failure::missing, product, "no such file");
  return Voucher(product).vouch();
}

}  // namespace windrow::engine
