// The invented island's relief and its true climate. Random weather comes from outside.
#pragma once
#include <string>

namespace demo {

double elevation_m(double lon, double lat);                                  ///< 0 at sea
double distance_km(double lon_a, double lat_a, double lon_b, double lat_b);  ///< plane, about the island's latitude
/// Mean over a cell of the relief grid's points in it, and the share of them that is land.
struct CellRelief {
  double height_m, land;
};
CellRelief cell_relief(double west, double south, double step);
/// The relief as an ESRI ASCII grid of 2 arc minutes, 46-50 N, 32-24 W, with its .prj beside it.
void write_relief(const std::string& path);

/// True air temperature in degC. `weather` is a standard variate, `year_phase` 0..1 from 1 January, `decades` since the
/// first day of the forced trend (0 in a world without it).
double true_temperature(double lat, double height_m, double year_phase, double decades, double weather);
/// True rain in mm/day; `threshold_shift` and `factor` are a model's errors (0 and 1 for the truth).
double rain(double height_m, double year_phase, double decades, double weather, double threshold_shift, double factor);
double season(double year_phase);  ///< 1 on the warmest day, -1 half a year later

}  // namespace demo
