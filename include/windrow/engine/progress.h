// What the engine tells while it works: how far it is, and what happens. Plain records; who shows them is not said here.
#pragma once
#include <cstddef>
#include <functional>
#include <string>

namespace windrow::engine {

struct ProgressState {
  std::string phase;                          ///< "reading", "making tas_heron.nc": a few words
  double done_bytes = 0, total_bytes = 0;     ///< of the phase; total 0: not known
  std::size_t products_done = 0, products_total = 0;
};

struct Event {
  std::string kind;  ///< one word: "notice", "made", "current", "failed", ...
  std::string text;
};

/// May be called from any thread and at any rate; what receives them thins them out. Empty functions are allowed.
using ProgressSink = std::function<void(const ProgressState&)>;
using EventSink = std::function<void(const Event&)>;

}  // namespace windrow::engine
