// Joining time axes. Knows times only; grids and values are compared in run_variable.
#include "join.h"

#include <fmt/format.h>

#include <algorithm>
#include <tuple>

namespace windrow::cf {

namespace {

struct Step {
  TimeStep step;
  std::size_t order = 0;  ///< of the file among files sorted by first time
  std::size_t position = 0;
};

bool holds(const FileTime& file, calendar::Instant time) {
  return std::ranges::binary_search(file.steps, time, {}, &TimeStep::time);
}

bool covers(const FileTime& file, calendar::Instant time) {
  return file.steps.front().time <= time && time <= file.steps.back().time;
}

}  // namespace

JoinedTime join(const std::vector<std::string>& paths, const std::vector<FileTime>& times, Notices& notices) {
  std::vector<std::size_t> order(paths.size());
  for (std::size_t i = 0; i < order.size(); ++i) order[i] = i;
  std::ranges::sort(order, {}, [&](std::size_t i) { return std::tuple(times[i].steps.front().time, paths[i]); });

  std::vector<Step> all;
  for (std::size_t k = 0; k < order.size(); ++k)
    for (std::size_t i = 0; i < times[order[k]].steps.size(); ++i) all.push_back({times[order[k]].steps[i], k, i});
  std::ranges::stable_sort(all, {}, [](const Step& s) { return std::tuple(s.step.time, s.order); });

  JoinedTime joined;
  std::vector<std::size_t> given_up(order.size(), 0);
  std::vector<std::size_t> to(order.size(), 0);
  std::size_t latest = 0;  // of the files seen so far, the one that reaches furthest
  for (std::size_t i = 0; i < all.size(); ++i) {
    if (times[order[all[i].order]].steps.back().time > times[order[latest]].steps.back().time) latest = all[i].order;
    if (i + 1 < all.size() && all[i + 1].step.time == all[i].step.time) {
      ++given_up[all[i].order];
      to[all[i].order] = all[i + 1].order;
      continue;
    }
    for (const std::size_t other : {latest, all[i].order > 0 ? all[i].order - 1 : 0}) {
      const FileTime& beside = times[order[other]];
      if (other != all[i].order && covers(beside, all[i].step.time) && !holds(beside, all[i].step.time))
        throw Error(Failure::data, paths[order[all[i].order]],
                    fmt::format("overlaps in time with {}, but their time stamps differ there", paths[order[other]]));
    }
    const std::size_t file = order[all[i].order], next = joined.steps.size();
    if (joined.spans.empty() || joined.spans.back().file != file ||
        joined.spans.back().file_first + joined.spans.back().count != all[i].position)
      joined.spans.push_back({file, all[i].position, next, 0});
    ++joined.spans.back().count;
    joined.steps.push_back(all[i].step);
  }
  for (std::size_t k = 0; k < order.size(); ++k)
    if (given_up[k] > 0)
      notices.add(paths[order[k]], fmt::format("{} time step{} also in {}; taken from there", given_up[k],
                                               given_up[k] > 1 ? "s are" : " is", paths[order[to[k]]]));
  return joined;
}

}  // namespace windrow::cf
