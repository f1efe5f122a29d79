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

/// Common misspellings ("m s**-1", "millibars", "deg_C", "degrees C", "mm d-1") are repaired, told through `odd`.
/// Error(data): `place: units 'x' are not known to UDUNITS`.
bool known(const std::string& units);
std::string repaired(const std::string& units, std::string* odd);

/// Conversion of a field of the given standard name. A mass flux of water (kg m-2 s-1) to a depth rate (mm/day) and an
/// amount (kg m-2) to a depth (mm) use 1000 kg m-3 and change the standard name to lwe_precipitation_rate /
/// lwe_thickness_of_precipitation_amount where the source name is precipitation_flux / precipitation_amount (likewise
/// the other names CF has an lwe_ form for). Error(data) when not convertible.
Conversion conversion(const std::string& from, const std::string& to, const std::string& standard_name,
                      const std::string& place);

/// True for units in which 0 is arbitrary (degC, degF): used for units_metadata.
bool is_temperature(const std::string& units);
/// Splits "mm/month" and "mm month-1" into "mm" and true: the month's own length counts, not UDUNITS' 30.4369 days.
bool per_month(const std::string& units, std::string* amount);

}  // namespace windrow::units
