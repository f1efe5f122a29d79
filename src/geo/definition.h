// What a job file may write as a coordinate reference system, as a text PROJ understands without guessing.
#pragma once
#include <string>

namespace windrow::geo {

/// AUTHORITY:CODE, a PROJ string, WKT, PROJJSON or an OGC URN, made complete: a plain PROJ string gets +type=crs.
/// Error(job) at `place` for anything else: PROJ would look a free text up as a name and take the nearest.
std::string complete_definition(const std::string& definition, const std::string& place);

}  // namespace windrow::geo
