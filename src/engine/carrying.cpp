#include "carrying.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace windrow::engine {
namespace {

void add_to(std::vector<double>& sum, const std::vector<double>& values) {
  if (sum.empty()) sum.assign(values.size(), 0.0);
  for (std::size_t i = 0; i < values.size(); ++i) sum[i] += values[i];
}

void divide(std::vector<double>& sum, std::size_t count) {
  for (double& x : sum) x /= static_cast<double>(count);
}

/// Variance of the mean over a station's years, by calendar month; of the logarithm for ratios. NaN without two years.
std::array<double, 12> monthly_variance(const station::Record& record, bool ratio) {
  std::array<double, 12> sum{}, square{}, count{}, out{};
  for (const auto& value : record.monthly) {
    const auto m = static_cast<std::size_t>(value.month - 1);
    sum[m] += value.value;
    count[m] += 1;
  }
  for (const auto& value : record.monthly) {
    const auto m = static_cast<std::size_t>(value.month - 1);
    const double off = value.value - sum[m] / count[m];
    square[m] += off * off;
  }
  for (std::size_t m = 0; m < 12; ++m) {
    const double mean = sum[m] / count[m];
    out[m] = count[m] > 1 ? square[m] / (count[m] - 1) / count[m] : std::numeric_limits<double>::quiet_NaN();
    if (ratio) out[m] = mean > 0 ? out[m] / (mean * mean) : std::numeric_limits<double>::quiet_NaN();
  }
  return out;
}

/// Sampling variance of every station's season means [station * seasons]. Moving windows take that of the month they
/// are centred in, which is a little more than their own; the year a twelfth of the months' mean.
std::vector<double> sampling_variance(const std::vector<const Fitted*>& fitted, const adjust::Setup& setup) {
  const std::size_t seasons = setup.season_count();
  std::vector<double> out;
  for (const Fitted* f : fitted) {
    const auto months = monthly_variance(*f->record, setup.multiplicative());
    double year = 0;
    for (const double v : months) year += v / 144;
    for (std::size_t s = 0; s < seasons; ++s) {
      out.push_back(seasons == 1 ? year : months[s * 12 / seasons]);
    }
  }
  return out;
}

reach::Variogram::Model model_of(job::VariogramModel model) {
  switch (model) {
    case job::VariogramModel::spherical:
      return reach::Variogram::Model::spherical;
    case job::VariogramModel::gaussian:
      return reach::Variogram::Model::gaussian;
    default:
      return reach::Variogram::Model::exponential;
  }
}

/// Takes slope * height off the stations' values.
void take_off(const reach::Drift& drift, const std::vector<double>& heights, std::vector<double>& values) {
  const std::size_t width = drift.slope.size();
  for (std::size_t i = 0; i < values.size(); ++i) values[i] -= drift.slope[i % width] * heights[i / width];
}

/// The reach of all stations and of those with a shape.
class Carrier {
 public:
  Carrier(const job::ReachSpec& spec, const adjust::Setup& setup, const std::vector<const Fitted*>& fitted,
          Carried& out, Notices& notices)
      : spec_(spec), setup_(setup), fitted_(fitted), out_(out), notices_(notices) {
    for (const Fitted* f : fitted) {
      position_.push_back(f->record->site.position);
      height_.push_back(f->record->site.elevation_m);
    }
    options_.method = spec.method == job::ReachMethod::nearest            ? reach::Method::nearest
                      : spec.method == job::ReachMethod::inverse_distance ? reach::Method::inverse_distance
                                                                          : reach::Method::kriging;
    options_.radius_m = spec.radius_m;
    options_.power = spec.power;
    options_.neighbours = spec.neighbours;
  }

  /// Noise, drift and variogram, each from what the others leave: the drift by ordinary least squares, the variogram of
  /// what remains, the drift by that variogram, and the variogram again. All of them are learnt from what is carried:
  /// corrections hold the steps between coarse cells, which a variogram takes for noise, so that kriging of targets by
  /// it would average far and wide.
  void learn() {
    if (!spec_.kriges()) return;
    options_.noise =
        reach::standardised_noise(out_.station_level, sampling_variance(fitted_, setup_), setup_.season_count());
    if (spec_.method != job::ReachMethod::kriging_height) {
      options_.variogram = variogram(out_.station_level);
      return;
    }
    auto rest = out_.station_level;
    take_off(fit_drift(std::nullopt), height_, rest);
    options_.variogram = variogram(rest);
    out_.drift = fit_drift(options_.variogram);
    if (out_.drift.used) take_off(out_.drift, height_, out_.station_level);
    options_.variogram = variogram(out_.station_level);
  }

  [[nodiscard]] reach::ReachMap make(const std::vector<GeoPoint>& places, bool with_shape) const {
    std::vector<GeoPoint> stations;
    reach::Options options = options_;
    options.noise.clear();
    for (std::size_t i = 0; i < fitted_.size(); ++i) {
      if (with_shape && !fitted_[i]->fit.shape) continue;
      stations.push_back(position_[i]);
      if (!options_.noise.empty()) options.noise.push_back(options_.noise[i]);
    }
    return reach::make_reach(stations, places, options, with_shape ? nullptr : &notices_);
  }

  [[nodiscard]] const reach::Variogram& variogram() const { return options_.variogram; }

 private:
  [[nodiscard]] reach::Variogram variogram(const std::vector<double>& values) const {
    const auto& given = spec_.variogram;
    if (!given.fit) return {model_of(given.model), given.nugget, given.sill, given.range_m};
    return reach::fit_variogram(position_, values, setup_.season_count(), options_.noise, model_of(given.model),
                                notices_);
  }
  /// What it says, it says when it has its final variogram.
  [[nodiscard]] reach::Drift fit_drift(const std::optional<reach::Variogram>& variogram) const {
    Notices quiet;
    return reach::fit_drift(height_, out_.station_level, setup_.season_count(), position_, variogram, options_.noise,
                            variogram ? notices_ : quiet);
  }

  const job::ReachSpec& spec_;
  const adjust::Setup& setup_;
  const std::vector<const Fitted*>& fitted_;
  Carried& out_;
  Notices& notices_;
  std::vector<GeoPoint> position_;
  std::vector<double> height_;
  reach::Options options_;
};

}  // namespace

Carried carry_over(const job::JobSpec& job, const job::FieldSpec& field, const adjust::Setup& setup,
                   const std::vector<const Fitted*>& fitted, const std::vector<GeoPoint>& places, Notices& notices) {
  Carried out;
  const bool target = field.adjust.carry == job::Carry::target;
  for (const Fitted* f : fitted) {
    const auto& values = target ? f->fit.target_level : f->fit.correction_level;
    out.station_level.insert(out.station_level.end(), values.begin(), values.end());
    add_to(out.mean_correction_level, f->fit.correction_level);
    ++out.level_stations;
    if (!f->fit.shape) continue;
    const auto& shapes = target ? f->fit.target_shape : f->fit.correction_shape;
    out.station_shape.insert(out.station_shape.end(), shapes.begin(), shapes.end());
    add_to(out.mean_correction_shape, f->fit.correction_shape);
    ++out.shape_stations;
  }
  divide(out.mean_correction_level, out.level_stations);
  if (out.shape_stations > 0) divide(out.mean_correction_shape, out.shape_stations);
  if (job.reach.beyond == job::Beyond::raw) {
    std::fill(out.mean_correction_level.begin(), out.mean_correction_level.end(), 0.0);
    std::fill(out.mean_correction_shape.begin(), out.mean_correction_shape.end(), 0.0);
  }
  Carrier carrier(job.reach, setup, fitted, out, notices);
  carrier.learn();
  out.level = carrier.make(places, false);
  if (setup.width() > 0) out.shape = carrier.make(places, true);
  if (!job.reach.kriges()) return out;
  const reach::Variogram& v = carrier.variogram();
  notices.add(
      fmt::format("field '{}'", field.name),
      fmt::format("kriging with nugget {:.3g}, sill {:.3g}, range {:.0f} km{}; {} negative weights set to zero",
                  v.nugget, v.sill, v.range_m / 1000, out.drift.used ? ", height as drift" : "", out.level.clipped));
  return out;
}

void hand_over(const Carried& carried, std::span<const double> height, pipeline::AdjustInput& adjust) {
  adjust.level = &carried.level;
  adjust.shape = &carried.shape;
  adjust.station_level = carried.station_level;
  adjust.station_shape = carried.station_shape;
  adjust.mean_correction_level = carried.mean_correction_level;
  adjust.mean_correction_shape = carried.mean_correction_shape;
  if (!carried.drift.used) return;
  adjust.drift_slope = carried.drift.slope;
  for (const double metres : height) adjust.drift_height.push_back(reach::drift_height(carried.drift, metres));
}

}  // namespace windrow::engine
