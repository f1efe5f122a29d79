// From a field of a run to a stage that can be run: maps, weights, calibration, scan, units of work. Private to the
// engine.
#pragma once
#include <map>
#include <memory>
#include <optional>
#include <vector>

#include "assemble.h"
#include "calibration.h"
#include "field_regridding.h"
#include "session.h"
#include "windrow/plan/units.h"

namespace windrow::engine {

/// Calibrations are shared by the runs of a family; cell heights by all fields.
class SharedFits {
 public:
  struct Fit {
    Calibration calibration;
    std::vector<Notice> notices;
  };
  /// Notices of a calibration that fails go to `told`; otherwise they are the fit's.
  const Fit& fit(Session& session, std::size_t field, std::size_t anchor, Notices& told);
  const std::vector<double>& cell_height(Session& session);

 private:
  std::map<std::pair<std::size_t, std::size_t>, Fit> fits_;
  std::optional<std::vector<double>> height_;
};

/// Everything of a stage; members refer to one another, so it stays where it is made.
struct StageSetup {
  Regridding regridding;
  MapPtr map;  ///< the regridding's, or made from it: vectors, masked cells
  ReaderSet run_readers, anchor_readers;
  std::vector<double> fraction;  ///< land fraction of every source cell; empty: none
  linear_map::Weights weights;
  Scan scan;
  const Calibration* calibration = nullptr;
  std::unique_ptr<StageContext> context;
  pipeline::AdjustInput adjust;
  plan::Stage stage;
  const Source* anchor = nullptr;  ///< when it is another run
};

/// Error(data) when mesh and source do not meet, units do not convert, grids of fixed fields differ... `notices` takes
/// what is to be told, of a stage that fails too.
std::unique_ptr<StageSetup> set_up(Session& session, SharedFits& fits, std::size_t field, std::size_t run,
                                   std::vector<Product> products, Notices& notices);

/// The job's tile, or the automatic chunk of a product.
plan::Chunk chunk_of(const Session& session, const Target& target, cf::Frequency frequency, bool adjusted);

/// Output units of a field for a run: the job's, or the source's in UDUNITS' spelling.
std::string output_units(Session& session, std::size_t field, std::size_t run);

/// The ceiling of the job or 80 % of what the process may use.
std::int64_t memory_ceiling(const job::JobSpec& job);
int thread_count(const Session& session);

}  // namespace windrow::engine
