// Files the job reads: globbing, settling, content digests kept in the workspace. Private to the engine.
#pragma once
#include <map>
#include <mutex>
#include <string>
#include <vector>

#include "windrow/codec/digest.h"
#include "windrow/job/spec.h"
#include "windrow/os/files.h"

namespace windrow::engine {

/// Digest of a file's bytes. Error(missing), Error(io).
codec::Digest digest_file(const std::string& path);

/// Content digests by (path, size, mtime, inode). A file whose mtime is within 2 s of the look is digested again next
/// time: it may change without its stamp changing. Thread-safe.
class DigestCache {
 public:
  /// `file`: where the cache is kept; read now if it exists, unless `reread`.
  DigestCache(std::string file, bool reread);
  /// Error(missing), Error(io).
  codec::Digest of(const std::string& path);
  void save() const;  ///< only when something was added

 private:
  struct Entry {
    os::FileState state;
    codec::Digest digest;
  };
  std::string file_;
  std::map<std::string, Entry> entries_;
  bool changed_ = false;
  std::mutex mutex_;
};

/// The run's patterns expanded, each file once, sorted. Error(missing) names the pattern that matches nothing.
std::vector<std::string> run_files(const job::RunSpec& run);

/// Waits until no file was changed within the last `settle_s` seconds: half-copied inputs are not read.
/// Error(interrupted) when asked to stop meanwhile.
void wait_until_settled(const std::vector<std::vector<std::string>>& files, double settle_s);

/// Path as the ledger tells it: relative to the job file's folder when below it.
std::string told_path(const std::string& path, const std::string& job_folder);

/// Text with every `mark` replaced by `value`.
std::string with_value(std::string text, const std::string& mark, const std::string& value);

/// Text with {run} and {family} replaced.
std::string for_run(std::string text, const job::RunSpec& run);

}  // namespace windrow::engine
