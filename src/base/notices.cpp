#include "windrow/base/notices.h"

#include <algorithm>

namespace windrow {

void Notices::add(const std::string& place, const std::string& text) {
  const std::lock_guard lock(mutex_);
  Notice notice{place, text};
  if (std::find(list_.begin(), list_.end(), notice) == list_.end()) list_.push_back(std::move(notice));
}

std::vector<Notice> Notices::list() const {
  const std::lock_guard lock(mutex_);
  return list_;
}

}  // namespace windrow
