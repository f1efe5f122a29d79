// How progress is worded, and the line on a terminal that shows it. What is logged is in json_lines.h.
#pragma once
#include <cstddef>
#include <functional>
#include <mutex>
#include <string>

#include "windrow/engine/progress.h"

namespace windrow::cli {

/// "35 s", "4 min", "2 h 10 min", "3 d 4 h": rounded as a person would say it.
std::string duration_text(double seconds);

/// Speed over about the last ten seconds: an exponential mean, so that a pause shows and a spike does not.
class RateMeter {
 public:
  /// `seconds` on a monotonic clock. A new phase, or fewer bytes than before, starts anew.
  void add(const std::string& phase, double done_bytes, double seconds);
  [[nodiscard]] double bytes_per_second() const { return rate_; }  ///< 0: not known yet

 private:
  std::string phase_;
  double last_bytes_ = 0, last_seconds_ = 0, rate_ = 0;
  bool started_ = false;
};

/// One line without a newline, at most `columns` characters: phase, products, bytes, share, rate, time left; what is
/// not known is left out.
std::string progress_text(const engine::ProgressState& state, double bytes_per_second, int columns);

/// Rewrites one line in place, at most five times a second. Thread-safe.
class ProgressLine {
 public:
  using Writer = std::function<void(const std::string&)>;  ///< gets text to put on the terminal as it is
  using Clock = std::function<double()>;                   ///< monotonic seconds
  ProgressLine(Writer write, Clock clock, int columns);
  void show(const engine::ProgressState& state);
  void clear();  ///< takes the line away, so that other text can be printed

 private:
  std::mutex mutex_;
  Writer write_;
  Clock clock_;
  int columns_;
  RateMeter rate_;
  double last_shown_ = -1e9;
  bool visible_ = false;
};

}  // namespace windrow::cli
