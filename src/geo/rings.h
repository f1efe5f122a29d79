// Rings of polygons as numbers: finite, laid out over the date line. No library here.
#pragma once
#include <optional>

#include "windrow/mesh/cell_records.h"

namespace windrow::geo {

bool all_finite(const mesh::PolygonCell& cell);

/// The cell, in degrees, with rings that go the short way from point to point, so that none jumps across the picture
/// where it crosses the date line; holes lie within reach of their outer ring, parts stay where they begin (two that
/// were cut apart at the date line would otherwise share a side, which no valid polygon may). Nothing when a ring goes
/// round a pole.
std::optional<mesh::PolygonCell> unrolled(const mesh::PolygonCell& cell);

}  // namespace windrow::geo
