// The invented island: relief from an ellipse, a summit and lattice noise; climate from the constants in invented.h.
#include "island.h"

#include <algorithm>
#include <cmath>
#include <fstream>
#include <stdexcept>

#include "invented.h"
#include "weather.h"

namespace demo {
namespace {

constexpr double kKmPerDegree = 111.195;          // a degree of a great circle on a sphere of 6371 km radius
constexpr double kCosCentre = 0.669130606358858;  // cos 48 degrees
constexpr std::uint64_t kReliefSeed = 11;
constexpr double kLattice_km = 14;
constexpr int kGridPerDegree = 30;  // 2 arc minutes
constexpr double kGridWest = -32, kGridSouth = 46;
constexpr int kGridColumns = 8 * kGridPerDegree, kGridRows = 4 * kGridPerDegree;

double east_km(double lon) { return (lon - kCentreLon) * kKmPerDegree * kCosCentre; }
double north_km(double lat) { return (lat - kCentreLat) * kKmPerDegree; }

double lattice_noise(double x_km, double y_km) {
  const double x = x_km / kLattice_km + 100, y = y_km / kLattice_km + 100;
  const auto i = static_cast<std::uint64_t>(x), j = static_cast<std::uint64_t>(y);
  const double s = x - static_cast<double>(i), t = y - static_cast<double>(j);
  const double u = s * s * (3 - 2 * s), v = t * t * (3 - 2 * t);
  return (1 - v) * ((1 - u) * uniform(kReliefSeed, i, j) + u * uniform(kReliefSeed, i + 1, j)) +
         v * ((1 - u) * uniform(kReliefSeed, i, j + 1) + u * uniform(kReliefSeed, i + 1, j + 1));
}

}  // namespace

double elevation_m(double lon, double lat) {
  const double x = east_km(lon), y = north_km(lat);
  const double a = x / kHalfWidth_km, b = y / kHalfLength_km;
  const double inland = 1.15 - a * a - b * b - 0.3 * lattice_noise(x / 2, y / 2);
  if (inland <= 0) return 0;
  const double dx = (x - kSummitEast_km) / kSummitReach_km, dy = (y - kSummitNorth_km) / kSummitReach_km;
  const double near = 1 / (1 + dx * dx + dy * dy);
  return kDome_m * inland * (0.35 + 0.65 * lattice_noise(x, y)) + kSummit_m * near * near * std::min(1.0, 3 * inland);
}

double distance_km(double lon_a, double lat_a, double lon_b, double lat_b) {
  const double x = east_km(lon_a) - east_km(lon_b), y = north_km(lat_a) - north_km(lat_b);
  return std::sqrt(x * x + y * y);
}

CellRelief cell_relief(double west, double south, double step) {
  const int across = static_cast<int>(step * kGridPerDegree);
  double height = 0, land = 0;
  for (int j = 0; j < across; ++j) {
    for (int i = 0; i < across; ++i) {
      const double here = elevation_m(west + (i + 0.5) / kGridPerDegree, south + (j + 0.5) / kGridPerDegree);
      height += here;
      land += here > 0 ? 1 : 0;
    }
  }
  return {height / across / across, land / across / across};
}

void write_relief(const std::string& path) {
  std::ofstream grid(path + ".asc", std::ios::binary);
  grid << "ncols " << kGridColumns << "\nnrows " << kGridRows << "\nxllcorner " << kGridWest << "\nyllcorner "
       << kGridSouth << "\ncellsize 0.03333333333333333\nNODATA_value -9999\n";
  for (int row = kGridRows - 1; row >= 0; --row) {
    for (int column = 0; column < kGridColumns; ++column) {
      const double height =
          elevation_m(kGridWest + (column + 0.5) / kGridPerDegree, kGridSouth + (row + 0.5) / kGridPerDegree);
      grid << std::lround(height) << (column + 1 < kGridColumns ? ' ' : '\n');
    }
  }
  std::ofstream projection(path + ".prj", std::ios::binary);
  projection << R"(GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563]],PRIMEM["Greenwich",0],)"
             << R"(UNIT["degree",0.0174532925199433]])" << '\n';
  if (!grid.flush() || !projection.flush()) throw std::runtime_error(path + ".asc: cannot be written");
}

double season(double year_phase) { return wave(year_phase - kWarmestDay / 365.25); }

double true_temperature(double lat, double height_m, double year_phase, double decades, double weather) {
  return kMeanTemperature + kTemperaturePerDegree * (lat - kCentreLat) + kSeasonAmplitude * season(year_phase) +
         kForcedTrend * decades + kLapse * height_m + kWeatherDeviation * weather;
}

double rain(double height_m, double year_phase, double decades, double weather, double threshold_shift, double factor) {
  const double excess = weather - kWetThreshold - kWetThresholdSeason * season(year_phase) - threshold_shift;
  if (excess <= 0) return 0;
  return factor * kRainScale * (excess + 0.8 * excess * excess) * (1 + kRainPerMetre * height_m) *
         (1 + kForcedRainTrend * decades);
}

}  // namespace demo
