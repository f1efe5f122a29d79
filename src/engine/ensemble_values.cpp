#include "ensemble_values.h"

#include <fmt/format.h>

#include <algorithm>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::engine {

namespace {
constexpr std::size_t kOpenProducts = 32;
}

std::size_t cell_blocks(const Target& target, const plan::Chunk& chunk) {
  return ((target.ny + chunk.y - 1) / chunk.y) * ((target.nx + chunk.x - 1) / chunk.x);
}

CellBlock cell_block(const Target& target, const plan::Chunk& chunk, std::size_t index) {
  const std::size_t across = (target.nx + chunk.x - 1) / chunk.x;
  const std::size_t y0 = index / across * chunk.y, x0 = index % across * chunk.x;
  return {y0, std::min(target.ny, y0 + chunk.y), x0, std::min(target.nx, x0 + chunk.x)};
}

std::shared_ptr<cf::ProductReader> ProductPool::open(const std::string& path) {
  const std::lock_guard lock(mutex_);
  const auto known = std::find_if(open_.begin(), open_.end(), [&](const auto& entry) { return entry.first == path; });
  if (known != open_.end()) {
    open_.splice(open_.begin(), open_, known);
    return known->second;
  }
  open_.emplace_front(path, cf::open_product(path));
  const auto opened = open_.front().second;
  if (open_.size() > kOpenProducts) open_.pop_back();
  return opened;
}

void MemberReader::read(std::size_t member, const CellBlock& block, std::span<const std::size_t> steps,
                        std::vector<float>& out) {
  const Series& series = *stage_.members[member];
  out.resize(steps.size() * block.cells());
  std::vector<float> part;
  for (std::size_t i = 0; i < steps.size();) {
    const auto after = std::upper_bound(series.products.begin(), series.products.end(), steps[i],
                                        [](std::size_t t, const Product& product) { return t < product.span.t1; });
    if (after == series.products.end() || steps[i] < after->span.t0) {
      throw Error(Failure::defect, series.name, fmt::format("no product holds step {}", steps[i]));
    }
    std::size_t end = i + 1;
    while (end < steps.size() && steps[end] == steps[end - 1] + 1 && steps[end] < after->span.t1) ++end;
    const std::size_t first = steps[i] - after->span.t0;
    std::vector<std::size_t> start{first, block.y0, block.x0}, count{end - i, block.y1 - block.y0, block.x1 - block.x0};
    if (!rows_) {
      start.erase(start.begin() + 1);
      count.erase(count.begin() + 1);
    }
    pool_.open(after->path)->read_window(text_.variable, start, count, part);
    std::transform(part.begin(), part.end(), out.begin() + static_cast<std::ptrdiff_t>(i * block.cells()),
                   [&](float x) { return x == text_.missing ? std::numeric_limits<float>::quiet_NaN() : x; });
    i = end;
  }
}

std::vector<double> monthly_means(const EnsembleStage& stage, MemberReader& reader, const CellBlock& block,
                                  std::size_t steps_at_once) {
  const Series& series = *stage.members.front();
  ensemble::MonthlyMeans means(block.cells(), stage.period.last - stage.period.first + 1);
  const std::span<const std::size_t> steps(stage.period_steps);
  std::vector<float> values;
  for (std::size_t t = 0; t < steps.size();) {
    // Windows end where the product's chunks do, so that no chunk is read twice.
    const auto after = std::upper_bound(series.products.begin(), series.products.end(), steps[t],
                                        [](std::size_t at, const Product& product) { return at < product.span.t1; });
    const std::size_t in_chunk = (steps[t] - after->span.t0) % steps_at_once;
    const std::size_t count = std::min(steps.size() - t, steps_at_once - in_chunk);
    reader.read(0, block, steps.subspan(t, count), values);
    for (std::size_t i = 0; i < count; ++i) {
      const auto& date = series.dates[steps[t + i]];
      means.add(date.year, date.month, std::span(values).subspan(i * block.cells(), block.cells()));
    }
    t += count;
  }
  return means.finish();
}

double ensemble_value(const EnsembleStage& stage, std::size_t output, std::span<double> members, double scale) {
  if (stage.kind == EnsembleKind::contrast) return (members[0] - members[1]) * scale;
  const auto& statistic = stage.statistics[output];
  switch (statistic.kind) {
    case job::StatisticKind::mean:
      return ensemble::mean(members);
    case job::StatisticKind::spread:
      return ensemble::spread(members) * scale;
    case job::StatisticKind::quantile:
      return ensemble::quantile(members, statistic.p);
    case job::StatisticKind::agreement:
      return ensemble::agreement(members);
  }
  return std::numeric_limits<double>::quiet_NaN();
}

}  // namespace windrow::engine
