// Bilinear weights on latitude-longitude grids, also rotated ones: linear in the grid's own longitude and latitude.
#include <algorithm>
#include <cmath>

#include "sampling.h"
#include "windrow/mesh/frame.h"

namespace windrow::overlap {
namespace {

// Between two neighbours on one axis: `part` of the way from `low` to `high`.
struct Between {
  std::size_t low = 0, high = 0;
  double part = 0;
};

class RowsAndColumns final : public Sampler {
 public:
  explicit RowsAndColumns(const mesh::Mesh& source) : closed_(mesh::all_round(*source.latlon())) {
    const mesh::LatLonEdges& edges = *source.latlon();
    west_deg_ = edges.lon_deg.front();
    for (std::size_t i = 0; i + 1 < edges.lon_deg.size(); ++i) {
      lon_deg_.push_back(0.5 * (edges.lon_deg[i] + edges.lon_deg[i + 1]));
    }
    for (std::size_t j = 0; j + 1 < edges.lat_deg.size(); ++j) {
      lat_deg_.push_back(0.5 * (edges.lat_deg[j] + edges.lat_deg[j + 1]));
    }
    south_pole_ = closed_ && edges.lat_deg.front() == -90;
    north_pole_ = closed_ && edges.lat_deg.back() == 90;
    if (source.rotation() != nullptr) frame_.emplace(*source.rotation());
  }

  void weigh(const Place& place, std::size_t /*containing*/, std::vector<Weight>& out) const override {
    double lambda = place.position.longitude.degrees(), phi = place.position.latitude.degrees();
    if (frame_) {
      const sphere::Vec3 own = frame_->to_frame(place.direction);
      lambda = Angle::radians(std::atan2(own.y, own.x)).degrees();
      phi = Angle::radians(std::atan2(own.z, std::hypot(own.x, own.y))).degrees();
    }
    const Between column = along_columns(lambda);
    if (phi > lat_deg_.back() && north_pole_) {
      const double part = (phi - lat_deg_.back()) / (90 - lat_deg_.back());
      add_row(lat_deg_.size() - 1, column, 1 - part, out);
      add_mean(lat_deg_.size() - 1, part, out);
    } else if (phi < lat_deg_.front() && south_pole_) {
      const double part = (lat_deg_.front() - phi) / (lat_deg_.front() + 90);
      add_row(0, column, 1 - part, out);
      add_mean(0, part, out);
    } else {
      const Between row = clamped(lat_deg_, phi);
      add_row(row.low, column, 1 - row.part, out);
      add_row(row.high, column, row.part, out);
    }
  }

 private:
  static Between clamped(const std::vector<double>& at, double x) {
    if (x <= at.front()) return {0, 0, 0};
    if (x >= at.back()) return {at.size() - 1, at.size() - 1, 0};
    const auto high = static_cast<std::size_t>(std::upper_bound(at.begin(), at.end(), x) - at.begin());
    return {high - 1, high, (x - at[high - 1]) / (at[high] - at[high - 1])};
  }
  [[nodiscard]] Between along_columns(double lambda) const {
    // Within the turn that begins at the grid's west edge. Rounding may leave a place on that edge just west of it.
    lambda += 360 * std::ceil((west_deg_ - 1e-12 - lambda) / 360);
    if (!closed_) return clamped(lon_deg_, lambda);
    const std::size_t last = lon_deg_.size() - 1;
    const double gap = lon_deg_.front() + 360 - lon_deg_.back();
    if (lambda < lon_deg_.front()) return {last, 0, 1 - (lon_deg_.front() - lambda) / gap};
    if (lambda >= lon_deg_.back()) return {last, 0, (lambda - lon_deg_.back()) / gap};
    return clamped(lon_deg_, lambda);
  }
  void add_row(std::size_t row, const Between& column, double part, std::vector<Weight>& out) const {
    const std::size_t start = row * lon_deg_.size();
    out.push_back({static_cast<std::uint32_t>(start + column.low), part * (1 - column.part)});
    out.push_back({static_cast<std::uint32_t>(start + column.high), part * column.part});
  }
  void add_mean(std::size_t row, double part, std::vector<Weight>& out) const {
    const std::size_t start = row * lon_deg_.size();
    const double each = part / static_cast<double>(lon_deg_.size());
    for (std::size_t i = 0; i < lon_deg_.size(); ++i) out.push_back({static_cast<std::uint32_t>(start + i), each});
  }

  std::vector<double> lon_deg_, lat_deg_;  // of the centres
  double west_deg_ = 0;
  bool closed_, south_pole_ = false, north_pole_ = false;
  std::optional<mesh::Frame> frame_;
};

}  // namespace

std::unique_ptr<Sampler> rows_and_columns(const mesh::Mesh& source) { return std::make_unique<RowsAndColumns>(source); }

}  // namespace windrow::overlap
