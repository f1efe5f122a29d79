// Names of water quantities given by mass and by depth (liquid water equivalent).
#pragma once
#include <optional>
#include <string>

namespace windrow::units {

/// The standard name that the quantity has after turning mass into depth (or depth into mass, `to_depth` false); empty
/// when CF has none; nullopt when the name is not that of water. An empty name counts as water without a pair.
std::optional<std::string> water_name(const std::string& standard_name, bool to_depth);

}  // namespace windrow::units
