// From the job's words to the setup of an adjustment. Private to the engine.
#pragma once
#include <cstdint>
#include <string>

#include "windrow/adjust/setup.h"
#include "windrow/cf/dataset.h"
#include "windrow/job/spec.h"
#include "windrow/units/units.h"

namespace windrow::engine {

/// Which days are made wet is drawn from one field for the whole job: the seed is fixed, so that every product of every
/// family shares its days.
inline constexpr std::uint64_t kDrawSeed = 20260101;

/// Method, seasons and limits of a field for a run of the given frequency. Error(data) for what is neither daily nor
/// monthly.
adjust::Setup adjust_setup(const job::AdjustSpec& spec, const cf::RunVariable& variable,
                           const units::Conversion& conversion, const std::string& output_units,
                           const std::string& place);

/// In its units it is a depth or mass of water a time: for fields that are water, a speed is a rate in units too.
bool is_rate(const std::string& units);

}  // namespace windrow::engine
