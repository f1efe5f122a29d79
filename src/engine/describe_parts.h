// Parts of CF descriptions that products of runs and of ensembles share. Private to the engine.
#pragma once
#include <cstdint>
#include <set>
#include <span>
#include <string>
#include <vector>

#include "windrow/calendar/calendar.h"
#include "windrow/cf/dataset.h"
#include "windrow/cf/product.h"

namespace windrow::engine {

/// `time` and `time_bnds`.
std::vector<cf::SmallVariable> time_axis(const calendar::Calendar& calendar, std::span<const cf::TimeStep> steps);

/// Twelve months in the middle year `centre` with climatology bounds from `first` to `last` (CF 7.4); dimension `name`.
std::vector<cf::SmallVariable> climatology_axis(const calendar::Calendar& calendar, const std::string& name, int centre,
                                                int first, int last);

cf::SmallVariable status_flag(std::span<const std::uint8_t> flags, const std::vector<std::string>& horizontal,
                              const std::string& long_name);

/// Global attributes of a source that still hold for what is made of it; identifiers and dates of files are not.
const std::set<std::string>& kept_globals();
/// Replaces the attribute of that name, or adds it.
void set(std::vector<cf::NamedValue>& list, const std::string& name, cf::AttributeValue value);

}  // namespace windrow::engine
