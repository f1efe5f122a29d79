// [field.adjust] and [field.terrain]: how a field is adjusted.
#pragma once
#include "table.h"
#include "windrow/job/spec.h"

namespace windrow::job {

/// `table` is the [[field]]; `field` has its name and units already.
AdjustSpec read_adjust(const Table& table, const FieldSpec& field);
std::optional<TerrainSpec> read_terrain(const Table& table, const FieldSpec& field);

}  // namespace windrow::job
