// Rows of shares by ordinary kriging: one system for all stations or one a cell, then clipping and tapering.
#include "kriging.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

namespace windrow::reach {

/// Up to kLanes cells and the sites they use.
struct Kriging::Batch {
  std::vector<std::uint32_t> site;             ///< m
  std::vector<double> to_cell, weight, taper;  ///< m x kLanes
  std::array<double, kLanes> nearest_m{};
  void resize(std::size_t m) {
    to_cell.assign(m * kLanes, 0);
    weight.assign(m * kLanes, 0);
    taper.assign(m * kLanes, 0);
    nearest_m.fill(std::numeric_limits<double>::infinity());
  }
};

Sites merge_sites(const std::vector<GeoPoint>& stations, const Options& options) {
  Sites sites;
  for (std::uint32_t i = 0; i < stations.size(); ++i) {
    const Vector position = unit_vector(stations[i]);
    const double noise = options.variogram.nugget + (options.noise.empty() ? 0 : options.noise[i]);
    std::size_t s = noise == 0 ? 0 : sites.position.size();
    while (s < sites.position.size() &&
           (sites.noise[s] > 0 || arc_m(haversine(sites.position[s], position)) >= kSamePoint_m)) {
      ++s;
    }
    if (s < sites.position.size()) {
      sites.merged += sites.members[s].size() == 1 ? 2 : 1;
      sites.members[s].push_back(i);
      continue;
    }
    sites.position.push_back(position);
    sites.noise.push_back(noise);
    sites.members.push_back({i});
  }
  return sites;
}

std::vector<double> site_covariance(const std::vector<Vector>& position, const std::vector<double>& noise,
                                    const Variogram& variogram) {
  const std::size_t n = position.size();
  std::vector<double> matrix(n * n);
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = 0; j < i; ++j) {
      const double d = model_distance_m(variogram.model, haversine(position[i], position[j]));
      matrix[i * n + j] = matrix[j * n + i] = covariance(variogram, d);
    }
    matrix[i * n + i] = covariance(variogram, 0) + noise[i];
  }
  return matrix;
}

Kriging::Kriging(const std::vector<GeoPoint>& stations, const Options& options)
    : options_(options), sites_(merge_sites(stations, options)) {
  const std::size_t n = sites_.position.size();
  one_system_ = n > 0 && n <= static_cast<std::size_t>(kAllStations);
  if (!one_system_) return;
  covariance_ = site_covariance(sites_.position, sites_.noise, options.variogram);
  system_.set(covariance_, n, options.variogram.sill);
}

void Kriging::rows(std::span<const GeoPoint> cells, Block& block) const {
  Batch batch;
  if (one_system_) {
    for (std::size_t i = 0; i < cells.size(); i += kLanes) {
      rows_of_one_system(cells.subspan(i, std::min(kLanes, cells.size() - i)), batch, block);
    }
    return;
  }
  Neighbourhood near(sites_.position, options_);
  for (const GeoPoint& cell : cells) row_of_own_system(unit_vector(cell), near, batch, block);
}

void Kriging::rows_of_one_system(std::span<const GeoPoint> cells, Batch& batch, Block& block) const {
  const std::size_t n = sites_.position.size();
  batch.resize(n);
  batch.site.resize(n);
  std::array<Vector, kLanes> at{};
  for (std::size_t l = 0; l < cells.size(); ++l) at[l] = unit_vector(cells[l]);
  bool any = false;
  for (std::uint32_t i = 0; i < n; ++i) {
    batch.site[i] = i;
    for (std::size_t l = 0; l < cells.size(); ++l) {
      const double h = haversine(at[l], sites_.position[i]);
      const double d = arc_m(h);
      batch.nearest_m[l] = std::min(batch.nearest_m[l], d);
      const double model_d =
          options_.variogram.model == Variogram::Model::gaussian ? model_distance_m(options_.variogram.model, h) : d;
      batch.to_cell[i * kLanes + l] = covariance(options_.variogram, model_d);
      batch.taper[i * kLanes + l] = taper(d / options_.radius_m);
      any = any || d < options_.radius_m;
    }
  }
  if (any) {
    std::array<double, kLanes> mu{};
    batch.weight = batch.to_cell;
    system_.weights(batch.weight.data(), mu.data());
  }
  finish(batch, covariance_, cells.size(), block);
}

void Kriging::row_of_own_system(const Vector& cell, Neighbourhood& near, Batch& batch, Block& block) const {
  near.find(cell);
  batch.site.clear();
  const double nearest = arc_m(near.nearest().haversine);
  // All used stations as far as the first unused one: the limit of the tapers is undefined; they share.
  const bool all_at_edge = nearest >= near.cut_m();
  std::vector<double> noise, penalty, to_cell;
  std::vector<Vector> position;
  for (const Neighbour& n : near.near()) {
    const double d = arc_m(n.haversine);
    const double t = all_at_edge ? (d <= near.cut_m() ? 1 : 0) : taper(d / near.cut_m());
    if (t <= 0) continue;
    batch.site.push_back(n.station);
    position.push_back(sites_.position[n.station]);
    noise.push_back(sites_.noise[n.station]);
    penalty.push_back(options_.variogram.sill * (1 / t - 1));
    to_cell.push_back(covariance(options_.variogram, model_distance_m(options_.variogram.model, n.haversine)));
  }
  const std::size_t m = batch.site.size();
  batch.resize(m);
  if (!near.near().empty()) batch.nearest_m[0] = nearest;
  for (std::size_t i = 0; i < m; ++i) {
    batch.to_cell[i * kLanes] = to_cell[i];
    batch.taper[i * kLanes] = 1;
    batch.weight[i * kLanes] = all_at_edge ? 1 : to_cell[i];
  }
  std::vector<double> matrix = site_covariance(position, noise, options_.variogram);
  if (m > 0 && !all_at_edge) {
    std::vector<double> tapered = matrix;
    for (std::size_t i = 0; i < m; ++i) tapered[i * m + i] += penalty[i];
    KrigingSystem system;
    std::array<double, kLanes> mu{};
    system.set(tapered, m, options_.variogram.sill);
    system.weights(batch.weight.data(), mu.data());
    block.jitter = std::max(block.jitter, system.jitter());
  }
  finish(batch, matrix, 1, block);
}

void Kriging::finish(Batch& batch, const std::vector<double>& covariance, std::size_t lanes, Block& block) const {
  const std::size_t m = batch.site.size();
  std::array<bool, kLanes> used{};
  for (std::size_t l = 0; l < kLanes; ++l) {
    used[l] = l < lanes && m > 0 && batch.nearest_m[l] < options_.radius_m;
    std::uint64_t clipped = 0;
    double total = 0, kept = 0;
    const auto each = [&](auto&& change) {
      for (std::size_t i = l; i < m * kLanes; i += kLanes) change(batch.weight[i], batch.taper[i]);
    };
    if (!used[l]) {
      each([](double& w, double) { w = 0; });
      continue;
    }
    each([&](double& w, double t) {
      if (t > 0 && w < -kSmallestShare) ++clipped;
      w = std::max(w, 0.0) * t;
      total += w;
    });
    if (!(total > 0)) each([&](double& w, double t) { total += w = t; });
    each([&](double& w, double) {
      w /= total;
      if (w < kSmallestShare) w = 0;
      kept += w;
    });
    each([&](double& w, double) { w /= kept; });
    block.clipped += clipped;
    block.clipped_cells += clipped > 0 ? 1 : 0;
  }
  std::array<double, kLanes> variance{};
  estimation_variance(covariance, m, options_.variogram.sill, batch.weight.data(), batch.to_cell.data(),
                      variance.data());
  for (std::size_t l = 0; l < lanes; ++l) {
    const std::size_t before = block.column.size();
    if (used[l]) push_row(batch, l, block);
    block.count.push_back(static_cast<std::uint32_t>(block.column.size() - before));
    block.fade.push_back(fade_of(batch.nearest_m[l], options_.radius_m));
    block.variance.push_back(used[l] ? variance[l] : std::numeric_limits<double>::quiet_NaN());
  }
}

void Kriging::push_row(const Batch& batch, std::size_t lane, Block& block) const {
  std::vector<std::pair<std::uint32_t, double>> row;
  for (std::size_t i = 0; i < batch.site.size(); ++i) {
    const double w = batch.weight[i * kLanes + lane];
    if (w <= 0) continue;
    const auto& members = sites_.members[batch.site[i]];
    for (const std::uint32_t station : members) row.emplace_back(station, w / static_cast<double>(members.size()));
  }
  // Members of one site may stand between those of others.
  if (sites_.merged > 0) std::sort(row.begin(), row.end());
  for (const auto& [station, share] : row) block.push(station, share);
}

}  // namespace windrow::reach
