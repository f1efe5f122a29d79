// Notices of one kind in detail up to a few, then only their number: a bad file must not bury the rest.
#pragma once
#include <string>

#include "windrow/base/notices.h"

namespace windrow::station {

class Details {
 public:
  /// `rest`: what the number after the detailed ones counts, e.g. "impossible values left out".
  Details(Notices& notices, std::string rest) : notices_(notices), rest_(std::move(rest)) {}
  void add(const std::string& place, const std::string& text) {
    if (++count_ <= kDetailed) notices_.add(place, text);
  }
  /// Call once at the end.
  void finish(const std::string& place) {
    if (count_ > kDetailed) notices_.add(place, std::to_string(count_ - kDetailed) + " more " + rest_);
  }

 private:
  static constexpr int kDetailed = 5;
  Notices& notices_;
  std::string rest_;
  int count_ = 0;
};

}  // namespace windrow::station
