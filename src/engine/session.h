// One invocation: the job, its inputs opened once, its products with what they depend on. Private to the engine.
#pragma once
#include <map>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "inputs.h"
#include "source.h"
#include "target.h"
#include "windrow/base/notices.h"
#include "windrow/calendar/calendar.h"
#include "windrow/cf/dataset.h"
#include "windrow/engine/engine.h"
#include "windrow/job/spec.h"
#include "windrow/plan/staleness.h"
#include "windrow/plan/units.h"

namespace windrow::engine {

/// One file to be made: which field of which run, which steps, what it depends on.
struct Product {
  std::string path, ledger_path;
  std::size_t field = 0, run = 0;
  plan::ProductSpan span;
  plan::Key key;
  codec::Digest key_digest;
  std::vector<std::string> inputs;  ///< paths behind the key
  std::vector<std::string> origins; ///< of a product computed from others: the files behind those
  std::string stale;                ///< why it must be made; empty: up to date
};

/// Finished products of one field in time order, with their time axis: a run's, or what is computed from runs'.
struct Series {
  std::string name;               ///< what stands for {run}
  std::vector<Product> products;  ///< spans count on the axis below
  std::vector<cf::TimeStep> time;
  std::vector<calendar::Date> dates;
  calendar::Calendar calendar;
  cf::Frequency frequency = cf::Frequency::fixed;
};
class Session {
 public:
  /// Reads the job file and expands the runs' patterns. Errors as for the job file and missing inputs.
  Session(const std::string& job_file, const Options& options);

  const job::JobSpec job;
  const Options options;

  [[nodiscard]] const std::string& folder() const { return folder_; }
  [[nodiscard]] const std::vector<std::string>& files(std::size_t run) const { return files_[run]; }
  DigestCache& digests() { return *digests_; }
  MapStore& maps() { return *maps_; }
  const Target& target();  ///< made on first use
  const cf::RunVariable& variable(std::size_t field, std::size_t run);
  const Source& source(std::size_t field, std::size_t run);  ///< variable with its mesh
  /// The other field of a vector pair; nothing for a scalar.
  [[nodiscard]] std::optional<std::size_t> partner_of(std::size_t field) const;
  /// What was odd in the files of a field's variable in a run.
  [[nodiscard]] std::vector<Notice> notices(std::size_t field, std::size_t run);
  [[nodiscard]] std::size_t anchor_of(std::size_t run) const;
  [[nodiscard]] std::string height_path(std::size_t field, std::size_t run) const;  ///< model height; empty: none
  [[nodiscard]] bool adjusted(std::size_t field) const {
    return job.fields[field].adjust.method != job::Adjustment::none;
  }
  void wait_until_settled() const { engine::wait_until_settled(files_, job.settle_s); }
  /// What a run of the job would do with a product whose key is complete: fills in key_digest, stale and span.wanted.
  void judge(Product& product) const;
  /// First parts of a key: program and settings.
  [[nodiscard]] static plan::Key key_head(const std::vector<std::pair<std::string, std::string>>& settings);
  [[nodiscard]] bool writes() const { return writes_; }  ///< false: `plan`
  /// Keeps workspace objects in memory only: `plan` writes nothing.
  void write_nothing();

  /// The products of one field of one run with their staleness. Opens the run's files, digests all inputs.
  std::vector<Product> products(std::size_t field, std::size_t run);

 private:
  plan::Key key_of(std::size_t field, std::size_t run, const plan::ProductSpan& span, std::vector<std::string>& inputs);
  [[nodiscard]] std::string product_path(std::size_t field, std::size_t run, int year) const;

  std::string folder_;
  std::vector<std::vector<std::string>> files_;
  std::unique_ptr<DigestCache> digests_;
  std::unique_ptr<MapStore> maps_;
  std::optional<Target> target_;
  bool writes_ = true;
  struct Opened {
    Source source;  ///< mesh null until asked for
    Notices notices;
  };
  Opened& opened(std::size_t field, std::size_t run);
  std::map<std::pair<std::size_t, std::string>, Opened> sources_;  ///< by run and variable
};

/// PRODUCT.ledger.json beside PRODUCT.nc.
std::string ledger_path(const std::string& product_path);

/// Digest of a key: names the product's tiles in the spool.
codec::Digest digest_of(const plan::Key& key);

}  // namespace windrow::engine
