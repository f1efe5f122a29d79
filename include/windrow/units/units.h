// Unit conversion; the only module that knows UDUNITS-2. Parsing is serialised by the process-wide library mutex.
#pragma once
#include <string>

namespace windrow::units {

/// y = scale * x + offset, taken from the unit library once; cheap to copy, safe to share.
struct Affine {
  double scale = 1, offset = 0;
  [[nodiscard]] double operator()(double x) const { return scale * x + offset; }
  [[nodiscard]] bool identity() const { return scale == 1 && offset == 0; }
};

struct Conversion {
  Affine affine;
  std::string standard_name;  ///< standard name that holds after the conversion (may differ: water flux -> depth rate)
  std::string note;           ///< what was done beyond a plain conversion ("1000 kg m-3"), empty otherwise
};

/// True when UDUNITS-2 knows the units after repair; text of over 256 bytes is never units.
bool known(const std::string& units);
/// The units with common misspellings repaired, told through `odd` ("units 'x' are read as 'y'"; untouched when there
/// is nothing to tell): "m s**-1", "millibars", "deg_C", "degrees C", "mm d-1", "mm/24h", superscripts, Latin-1 bytes.
/// Some of these UDUNITS would take for something else ("mb" for millibarn, "degrees C" for radian coulomb).
std::string repaired(const std::string& units, std::string* odd);

/// Conversion of a field of the given standard name (may be empty); both units are repaired first. "C" and "F" opposite
/// a unit of temperature are degC and degF, not coulomb and farad. A mass flux of water (kg m-2 s-1) to a depth rate
/// (mm/day) and an amount (kg m-2) to a depth (mm), and back, use 1000 kg m-3 and change the standard name:
/// precipitation_flux <-> lwe_precipitation_rate, precipitation_amount <-> lwe_thickness_of_precipitation_amount,
/// likewise the other names CF has a pair for. For other names of water, and for an unnamed field, the standard name
/// becomes empty; a named field that is not water is refused.
/// Error(data): `place: units 'x' are not known to UDUNITS`, `place: units 'x' cannot be converted to 'y'`.
Conversion conversion(const std::string& from, const std::string& to, const std::string& standard_name,
                      const std::string& place);

/// True for units of temperature in which 0 is arbitrary (degC, degF), false for K: used for units_metadata.
bool is_temperature(const std::string& units);
/// Splits "mm/month" and "mm month-1" into "mm" and true: the month's own length counts, not UDUNITS' 30.4369 days.
/// `amount` is set only when true.
bool per_month(const std::string& units, std::string* amount);

}  // namespace windrow::units
