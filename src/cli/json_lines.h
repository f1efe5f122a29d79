// JSON for scripts: the log of a run, and what `run` and `vouch` print with --json. One object a line.
#pragma once
#include <fstream>
#include <mutex>
#include <string>
#include <vector>

#include "windrow/engine/engine.h"

namespace windrow::cli {

/// `time` is UTC, 2026-01-31T12:00:00Z. Bytes that are no UTF-8 are replaced.
std::string progress_json(const std::string& time, const engine::ProgressState& state);
std::string event_json(const std::string& time, const engine::Event& event);
std::string summary_json(const engine::Summary& summary);
std::string vouched_json(const engine::Vouched& vouched);

/// Appends to the file of --log-json; each line is flushed, progress at most once a second. Thread-safe.
class JsonLog {
 public:
  explicit JsonLog(const std::string& path);  ///< Error(output) when it cannot be opened
  void progress(const engine::ProgressState& state);
  void event(const engine::Event& event);
  [[nodiscard]] bool complete() const;  ///< false when a line could not be written

 private:
  void write(const std::string& line);

  mutable std::mutex mutex_;
  std::ofstream file_;
  double last_progress_ = -1e9;
};

}  // namespace windrow::cli
