// Pairs of CF standard names: mass of water and its depth. Source: CF standard name table. precipitation_flux and
// lwe_precipitation_rate were checked against version 83 of the table; the other names are from memory.
#include "water.h"

#include <string_view>

namespace windrow::units {
namespace {

struct Pair {
  std::string_view mass, depth;
};
constexpr Pair kPairs[] = {
    {"precipitation_flux", "lwe_precipitation_rate"},
    {"precipitation_amount", "lwe_thickness_of_precipitation_amount"},
    {"convective_precipitation_flux", "lwe_convective_precipitation_rate"},
    {"convective_precipitation_amount", "lwe_thickness_of_convective_precipitation_amount"},
    {"stratiform_precipitation_flux", "lwe_stratiform_precipitation_rate"},
    {"stratiform_precipitation_amount", "lwe_thickness_of_stratiform_precipitation_amount"},
    {"snowfall_flux", "lwe_snowfall_rate"},
    {"snowfall_amount", "lwe_thickness_of_snowfall_amount"},
    {"convective_snowfall_flux", "lwe_convective_snowfall_rate"},
    {"convective_snowfall_amount", "lwe_thickness_of_convective_snowfall_amount"},
    {"stratiform_snowfall_flux", "lwe_stratiform_snowfall_rate"},
    {"stratiform_snowfall_amount", "lwe_thickness_of_stratiform_snowfall_amount"},
    {"rainfall_flux", "rainfall_rate"},
    {"rainfall_amount", "thickness_of_rainfall_amount"},
    {"convective_rainfall_flux", "convective_rainfall_rate"},
    {"convective_rainfall_amount", "thickness_of_convective_rainfall_amount"},
    {"stratiform_rainfall_flux", "stratiform_rainfall_rate"},
    {"stratiform_rainfall_amount", "thickness_of_stratiform_rainfall_amount"},
    {"water_evapotranspiration_flux", "lwe_water_evaporation_rate"},
    {"water_evapotranspiration_amount", "lwe_thickness_of_water_evaporation_amount"},
    {"surface_snow_amount", "lwe_thickness_of_surface_snow_amount"},
    {"canopy_water_amount", "lwe_thickness_of_canopy_water_amount"},
    {"atmosphere_mass_content_of_water_vapor", "lwe_thickness_of_atmosphere_mass_content_of_water_vapor"}};

// Parts of names of water that CF gives no pair for.
constexpr std::string_view kWaterWords[] = {"precipitation", "rain",    "snow", "water", "runoff", "evapo",
                                            "moisture",      "drizzle", "lwe_", "hail",  "ice",    "dew"};

}  // namespace

std::optional<std::string> water_name(const std::string& standard_name, bool to_depth) {
  if (standard_name.empty()) return std::string();
  for (const Pair& pair : kPairs) {
    if (standard_name == (to_depth ? pair.mass : pair.depth)) return std::string(to_depth ? pair.depth : pair.mass);
  }
  for (const std::string_view word : kWaterWords) {
    if (standard_name.find(word) != std::string::npos) return std::string();
  }
  return std::nullopt;
}

}  // namespace windrow::units
