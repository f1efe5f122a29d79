// One pass over a run's coarse values before anything is made: what is missing, how large values are, source integrals.
// Private to the engine.
#pragma once
#include <cstdint>
#include <vector>

#include "windrow/linear_map/kernel.h"
#include "windrow/pipeline/stage.h"

namespace windrow::engine {

struct Scan {
  std::vector<std::uint32_t> columns;       ///< source cells that pairings (or filling) need, ascending
  std::vector<std::vector<bool>> masks;     ///< missing patterns over `columns`: a new one whenever it changes
  std::vector<std::uint32_t> mask_of_step;  ///< which pattern each step has
  std::vector<double> largest;              ///< largest |value| of each step
  std::vector<double> integral, absolute;   ///< of each step: sum of value (or |value|) * fraction * overlap area
  [[nodiscard]] bool mask_varies(std::size_t t0, std::size_t t1) const;
};

/// `column_weight`: fraction * overlap area of every map column, steradians.
Scan scan_source(const pipeline::SourceReader& reader, const std::vector<std::uint32_t>& columns,
                 const std::vector<double>& column_weight, std::size_t steps);

/// Overlap area of each column times its fraction; a column wholly inside the mesh counts with its own area, which
/// makes the balance independent of the pairings. Totals: the share of the column that lies inside the mesh. Increments
/// count with what they add to the part of a cell that the mesh covers.
std::vector<double> column_weights(const linear_map::LinearMap& map, const std::vector<double>& fraction);

/// Cover of every mesh cell under one missing pattern.
std::vector<float> cover_under(const linear_map::Weights& weights, const Scan& scan, std::uint32_t mask);

}  // namespace windrow::engine
