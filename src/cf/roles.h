// What a coordinate variable stands for: CF 1.13 sections 4.1-4.4 and 5.6. Names are a last resort and asked apart.
#pragma once
#include <string>

#include "header.h"

namespace windrow::cf {

enum class Role { unknown, latitude, longitude, grid_latitude, grid_longitude, x, y, time, vertical };

/// The role that the metadata gives a coordinate variable; names play no part.
Role role_of(const nc::Var& variable);
/// The role a name suggests; unknown for most names.
Role role_by_name(const std::string& name);
const char* role_text(Role role);

/// "m", "km" or "radian" for their many spellings, otherwise empty.
std::string plain_axis_units(const std::string& units);
/// Radian latitudes and longitudes are met in unstructured models.
bool is_radian(const std::string& units);
bool is_number(const nc::Var& variable);

/// True for variables that describe others: coordinates, bounds, grid mappings, mesh topologies, cell measures.
bool is_auxiliary(const Header& header, const nc::Var& variable);

}  // namespace windrow::cf
