// What windrow does, one function a command. Wires all modules together; prints nothing.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/base/notices.h"
#include "windrow/engine/progress.h"

namespace windrow::engine {

struct Options {
  int threads = 0;                     ///< 0: the job's, else the CPUs this process may use
  bool reread = false;                 ///< digest inputs anew
  double wait_s = 0;                   ///< for the workspace's lease
  std::vector<std::string> overrides;  ///< --set key=value
  std::string make_deps;               ///< makefile fragment to write; empty: none
};

enum class State { made, current, failed };
struct ProductStatus {
  std::string path;
  State state = State::made;
  std::string reason;  ///< why it was made or is failed, one line
};

struct Summary {
  std::vector<ProductStatus> products;  ///< job order
  std::vector<Notice> notices;
  std::optional<Failure> failure;  ///< the first failure's kind in job order; nothing when all is well
  double seconds = 0;
  double output_bytes = 0;  ///< uncompressed bytes made
  std::int64_t peak_memory = 0;
};

struct Report {
  std::string text;  ///< for people, ends with a newline
  std::string json;  ///< the same as one JSON document
};

/// `windrow run`. Error for what stops everything (job file, inputs missing, workspace held, interrupted).
Summary run(const std::string& job_file, const Options& options, const ProgressSink& progress, const EventSink& events);

/// `windrow plan`: reads, writes nothing.
Report plan(const std::string& job_file, const Options& options);

struct Proof {
  Report report;    ///< empty when nothing could be proven
  std::string csv;  ///< a line a station, season and score
  std::vector<Notice> notices;
  std::vector<std::string> failures;  ///< fields that could not be proven, one line each
  std::optional<Failure> failure;     ///< the first one's kind, in job order
};
/// `windrow prove`: cross-validation of every adjusted field, on the anchor run of each family. Writes nothing. Error
/// for what stops everything; Error(job) when no field is adjusted.
Proof prove(const std::string& job_file, const Options& options, const ProgressSink& progress);

/// `windrow inspect`: what one file is understood to be.
Report inspect(const std::string& path);

enum class Verdict { passed, failed, needs_inputs };
struct Check {
  std::string name;
  Verdict verdict = Verdict::passed;
  std::string text;  ///< figure and bound, or what is wrong
};
struct Vouched {
  std::string product;
  std::vector<Check> checks;
  std::string value_digest;          ///< of the data variable's values
  [[nodiscard]] bool holds() const;  ///< no check failed
};
/// `windrow vouch`. Error(missing) or Error(data) when the file cannot be opened at all.
Vouched vouch(const std::string& product);

}  // namespace windrow::engine
