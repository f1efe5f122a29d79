// Things a user should know that are no errors: what was odd and how it was read, who was left out and why.
#pragma once
#include <mutex>
#include <string>
#include <vector>

namespace windrow {

struct Notice {
  std::string place;  ///< file, variable or station
  std::string text;   ///< one sentence without a full stop
  bool operator==(const Notice&) const = default;
};

/// Thread-safe collector; an exact repetition is kept once. Order is that of the first occurrence.
class Notices {
 public:
  void add(const std::string& place, const std::string& text);
  [[nodiscard]] std::vector<Notice> list() const;

 private:
  mutable std::mutex mutex_;
  std::vector<Notice> list_;
};

}  // namespace windrow
