// One field of one run carried through: units of work, workers, spool. Knows no file format: source values come through
// SourceReader, finished products are reported to StageHooks.
#pragma once
#include <array>
#include <cstdint>
#include <functional>
#include <memory>
#include <span>
#include <vector>

#include "windrow/adjust/transfer.h"
#include "windrow/base/exact_sum.h"
#include "windrow/codec/digest.h"
#include "windrow/linear_map/kernel.h"
#include "windrow/pipeline/spool.h"
#include "windrow/pipeline/tile_stats.h"
#include "windrow/plan/units.h"
#include "windrow/reach/reach.h"

namespace windrow::pipeline {

/// Coarse values of one variable of one run. Steps count on the run's axis, columns are the map's.
class SourceReader {
 public:
  virtual ~SourceReader() = default;
  /// out[(t - t0) * columns.size() + i], source units, NaN where missing. Error(io).
  virtual void read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const = 0;
};

/// Pointwise settings of a field.
struct FieldMath {
  double scale = 1, offset = 0;  ///< source units -> output units
  double min_cover = 0.5, min_land = 0;
  bool has_range = false;
  double low = 0, high = 0;  ///< physical range in output units
  int keep_bits = 0;         ///< > 0: explicit mantissa bits kept (bit rounding)
  float missing = 9.96920997e36F;
};

/// Nearest source cells of every row, for `fill = "nearest"`; empty when nothing is filled.
struct FillCandidates {
  static constexpr std::size_t kPerRow = 4;
  std::vector<std::uint32_t> column;  ///< rows * kPerRow, nearest first; SourceBlock::kNotHeld: none
  [[nodiscard]] bool empty() const { return column.empty(); }
};

/// What adjustment needs on the mesh; see adjust/transfer.h for the meaning of reduced values.
struct AdjustInput {
  adjust::Setup setup;
  adjust::Steps anchor_steps, run_steps;
  bool run_is_anchor = true;
  const reach::ReachMap* level = nullptr;
  const reach::ReachMap* shape = nullptr;         ///< where the setup's width is not 0
  std::span<const double> station_level;          ///< [level station * seasons]: targets (or corrections)
  std::span<const double> station_shape;          ///< [shape station * seasons * width]
  std::span<const double> mean_correction_level;  ///< [seasons], for cells beyond reach
  std::span<const double> mean_correction_shape;  ///< [seasons * width]
  std::span<const double> drift_slope;            ///< [seasons], kriging-height; empty without
  std::vector<double> drift_height;               ///< one a mesh cell, with a drift
  bool missing_beyond = false;                    ///< cells beyond reach become missing
  bool terrain = false;
  std::array<double, 12> lapse{};    ///< output units per metre
  std::vector<double> model_height;  ///< one a mesh cell: model height carried to the mesh
  std::vector<double> anchor_model_height;
  std::vector<double> cell_height;                               ///< one a mesh cell
  std::shared_ptr<const adjust::Draws> anchor_draws, run_draws;  ///< where days may be made wet, else null
  std::vector<GeoPoint> cell_centre;                             ///< one a mesh cell, with draws
  [[nodiscard]] std::size_t seasons() const { return setup.season_count(); }
};

struct StageProduct {
  codec::Digest key;
  plan::ProductSpan span;
  bool cover_varies = false;  ///< a second variable, cover, for every chunk
};

/// Rounding constants of the exact integrals, one pair a step of the run: they follow the step's largest value alone,
/// so that appended months change nothing of earlier sums.
struct StepBins {
  std::vector<double> m1, m2;
  [[nodiscard]] BinnedSum::Bins at(std::size_t step) const { return {m1[step], m2[step]}; }
};

struct StageInput {
  const linear_map::Weights* weights = nullptr;
  std::size_t ny = 1, nx = 1;
  plan::Chunk chunk;
  FieldMath field;
  FillCandidates fill;
  int level = 1;  ///< deflate level; 0: stored raw
  StepBins bins;
  const AdjustInput* adjust = nullptr;
  std::vector<StageProduct> products;
};

struct StageHooks {
  std::function<void(std::size_t product)> finish;   ///< all chunks of a product are in the spool
  std::function<void(std::int64_t bytes)> progress;  ///< uncompressed bytes done; called from workers
  std::function<bool()> stop;                        ///< true: leave soon with Error(interrupted)
};

/// Numbers of spool variables.
inline constexpr std::uint32_t kDataVariable = 0, kCoverVariable = 1;

/// Makes all wanted products. What the spool holds is not made again. The first error of a worker ends the stage.
void run_stage(const StageInput& input, const plan::Stage& stage, const SourceReader& run, const SourceReader* anchor,
               Spool& spool, const StageHooks& hooks);

/// Statistics of a finished product, merged from the spool; flags have one entry a mesh cell.
TileStats merge_stats(const StageInput& input, std::size_t product, const Spool& spool);

/// Chunk number of a piece in its product.
std::uint32_t chunk_index(const StageInput& input, const plan::Piece& piece, std::uint32_t block);

}  // namespace windrow::pipeline
