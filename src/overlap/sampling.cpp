// From a sampler to a LinearMap: places, order, sums. Knows no way of weighing.
#include "sampling.h"

#include <fmt/format.h>

#include <algorithm>

#include "windrow/overlap/methods.h"

namespace windrow::overlap {
namespace {

// Weights below this are rounding: a place on a centre or a line between two takes nothing from the others.
constexpr double kNothing = 1e-13;

// Ascending, one entry a cell, sum 1.
void tidy(std::vector<Weight>& weights) {
  std::sort(weights.begin(), weights.end(), [](const Weight& a, const Weight& b) { return a.cell < b.cell; });
  std::size_t kept = 0;
  double sum = 0;
  for (std::size_t k = 0; k < weights.size();) {
    Weight one = weights[k];
    for (++k; k < weights.size() && weights[k].cell == one.cell; ++k) one.part += weights[k].part;
    if (!(one.part > kNothing)) continue;
    sum += one.part;
    weights[kept++] = one;
  }
  weights.resize(kept);
  for (Weight& w : weights) w.part /= sum;
}

}  // namespace

linear_map::LinearMap sampled(const Sampler& sampler, const mesh::Mesh& source, const mesh::Mesh& target,
                              const std::string& method) {
  constexpr std::size_t kRun = 1024;
  struct Run {
    std::vector<std::uint32_t> count;
    std::vector<Weight> weights;
  };
  std::vector<Run> runs((target.size() + kRun - 1) / kRun);
  const mesh::Earth earth = target.earth();
#pragma omp parallel
  {
    std::vector<Weight> weights;
#pragma omp for schedule(dynamic)
    for (std::size_t r = 0; r < runs.size(); ++r) {
      for (std::size_t k = r * kRun; k < std::min(target.size(), (r + 1) * kRun); ++k) {
        Place place{target.centre(k), {}};
        place.direction = on_sphere(place.position, earth);
        weights.clear();
        if (const std::optional<std::size_t> cell = source.find(place.position)) {
          sampler.weigh(place, *cell, weights);
          tidy(weights);
        }
        runs[r].count.push_back(static_cast<std::uint32_t>(weights.size()));
        runs[r].weights.insert(runs[r].weights.end(), weights.begin(), weights.end());
      }
    }
  }
  linear_map::LinearMap map;
  map.columns = map.value_columns = source.size();
  map.provenance = fmt::format("{}; from {}; to {}", method, source.describe(), target.describe());
  map.row_start.push_back(0);
  for (Run& run : runs) {
    std::size_t p = 0;
    for (const std::uint32_t count : run.count) {
      for (std::uint32_t n = 0; n < count; ++n, ++p) {
        map.column.push_back(run.weights[p].cell);
        map.share.push_back(run.weights[p].part);
      }
      map.row_start.push_back(map.column.size());
    }
    run = {};
  }
  if (target.has_area()) {
    for (std::size_t k = 0; k < target.size(); ++k) map.row_area.push_back(target.area(k));
  }
  if (source.has_area()) {
    for (std::size_t k = 0; k < source.size(); ++k) map.column_area.push_back(source.area(k));
  }
  return map;
}

linear_map::LinearMap bilinear(const mesh::Mesh& source, const mesh::Mesh& target) {
  const auto [ny, nx] = source.shape();
  std::unique_ptr<Sampler> sampler;
  if (source.latlon() != nullptr) {
    sampler = rows_and_columns(source);
  } else if (ny > 1 && nx > 1) {
    sampler = quadrilaterals(source);
  } else {
    sampler = triangles(source);
  }
  return sampled(*sampler, source, target, "bilinear between cell centres");
}

}  // namespace windrow::overlap
