// Rows of shares by ordinary kriging on the globe. Private.
#pragma once
#include <span>
#include <vector>

#include "kriging_system.h"
#include "rows.h"

namespace windrow::reach {

/// Stations of one place, or one station.
struct Sites {
  std::vector<Vector> position;
  std::vector<double> noise;                        ///< nugget and own sampling variance
  std::vector<std::vector<std::uint32_t>> members;  ///< ascending
  std::size_t merged = 0;                           ///< stations that share their place with others
};
/// Stations within kSamePoint_m of one another are one site if none of them has nugget or noise.
Sites merge_sites(const std::vector<GeoPoint>& stations, const Options& options);

/// n x n covariances of sites, noise and nugget on the diagonal.
std::vector<double> site_covariance(const std::vector<Vector>& position, const std::vector<double>& noise,
                                    const Variogram& variogram);

/// Made once, shared by the threads.
class Kriging {
 public:
  Kriging(const std::vector<GeoPoint>& stations, const Options& options);
  void rows(std::span<const GeoPoint> cells, Block& block) const;
  [[nodiscard]] const Sites& sites() const { return sites_; }
  [[nodiscard]] double jitter() const { return system_.jitter(); }  ///< of the one system, if it is one

 private:
  struct Batch;
  void rows_of_one_system(std::span<const GeoPoint> cells, Batch& batch, Block& block) const;
  void row_of_own_system(const Vector& cell, Neighbourhood& near, Batch& batch, Block& block) const;
  void finish(Batch& batch, const std::vector<double>& covariance, std::size_t lanes, Block& block) const;
  void push_row(const Batch& batch, std::size_t lane, Block& block) const;

  const Options& options_;
  Sites sites_;
  bool one_system_ = false;
  std::vector<double> covariance_;  ///< of the one system
  KrigingSystem system_;
};

}  // namespace windrow::reach
