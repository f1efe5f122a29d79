// How alike stations are by distance: variogram models, their fit, and the height drift fitted with them. No shares.
#pragma once
#include <cstddef>
#include <optional>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/base/notices.h"

namespace windrow::reach {

/// Variances in units of the standardised values (variance 1 over the stations), distances on the globe.
struct Variogram {
  enum class Model { exponential, spherical, gaussian };
  Model model = Model::exponential;
  double nugget = 0.1;     ///< noise and variation finer than any distance between stations; 0 .. sill
  double sill = 1;         ///< total, nugget included
  double range_m = 300e3;  ///< practical: where the correlation has fallen to exp(-3) = 5 % (spherical: to 0)
  bool operator==(const Variogram&) const = default;
};

/// Covariance of the smooth part (without nugget) at `distance` >= 0 in metres, with h = distance / range:
/// (sill - nugget) times exp(-3 h), 1 - 1.5 h + 0.5 h^3 (0 from h = 1 on) or exp(-3 h^2).
/// On the globe the first two take great-circle distances, with which they are positive definite (Gneiting 2013,
/// Bernoulli 19:1327, table 1, from memory); the Gaussian takes the chord (for those it is, being so in space).
double covariance(const Variogram& variogram, double distance);

/// Throws Error unless sill > 0, 0 <= nugget <= sill, range > 0 and all are finite.
void check(const Variogram& variogram);

/// Each station's sampling variance in units of the standardised values, the mean over the seasons that vary.
/// values [station * width], sampling_variance alike, in squared units of the values. A station without a finite
/// variance gets the mean of the others.
std::vector<double> standardised_noise(const std::vector<double>& values, const std::vector<double>& sampling_variance,
                                       std::size_t width);

/// Fits a model to values [station * width], one column a season. Each season is standardised (mean 0, variance 1 over
/// the stations), halved squared differences are pooled over the seasons, less both stations' `noise` [station] (empty:
/// 0; as from standardised_noise). Pairs up to half of the largest distance count (common practice) in bins of equal
/// numbers of pairs: one bin for every 30 pairs, but 4 to 100 bins. Weighted least squares with weights
/// N(h) / gamma(h)^2, gamma from the pass before (Cressie 1985, Math. Geol. 17:563, from memory; so done the estimates
/// are not drawn to large gamma): nugget and partial sill in closed form, both >= 0, for each of 60 ranges from the
/// first bin's distance to the largest, then golden section. Stations with a missing value (NaN) are left out.
/// Falls back, with a notice: fewer than 8 stations, or seasons that do not vary: nugget 0.1, sill 1, range half of the
/// largest distance (100 km if that is 0); partial sill under 5 %: pure nugget, so that all stations count alike.
/// A range at either end of the search is said. Cost: pairs * (width + log pairs).
Variogram fit_variogram(const std::vector<GeoPoint>& positions, const std::vector<double>& values, std::size_t width,
                        const std::vector<double>& noise, Variogram::Model model, Notices& notices);

/// Change with height that all stations share, one coefficient a column (season).
struct Drift {
  std::vector<double> slope;     ///< width; per metre; all 0 where not used
  double low_m = 0, high_m = 0;  ///< heights of the stations it was fitted to
  bool used = false;
};

/// One slope for each column of values [station * width] by generalised least squares with an unknown mean and the
/// variogram's covariance (plus `noise` [station], empty: 0), or ordinary least squares without a variogram. A nugget
/// under 1 % of the sill counts as that, or neighbours with different values would decide alone. Not used, with a
/// notice: heights spanning under 300 m, fewer than 5 stations. Stations with a missing height or value (NaN) are left
/// out. The caller takes slope * height off the stations' values and adds slope * drift_height at cells.
Drift fit_drift(const std::vector<double>& elevation_m, const std::vector<double>& values, std::size_t width,
                const std::vector<GeoPoint>& positions, const std::optional<Variogram>& variogram,
                const std::vector<double>& noise, Notices& notices);

/// The height held within those of the stations; NaN stays NaN.
double drift_height(const Drift& drift, double height_m);

}  // namespace windrow::reach
