// The NetCDF files of the invented models: daily runs, orography, land fraction.
#pragma once
#include <string>

#include "invented.h"

namespace demo {

/// NAME_all_YYYY-YYYY.nc and NAME_natural_YYYY-YYYY.nc for each decade, NAME_orog.nc and NAME_sftlf.nc, in
/// 64-bit-offset NetCDF. The two runs of a model share their weather: their difference is the forced trend alone.
void write_model(const Model& model, const std::string& folder);

}  // namespace demo
