// Stations meet the anchor run: records, transfers, reach. Private to the engine.
#pragma once
#include <string>
#include <vector>

#include "source.h"
#include "target.h"
#include "windrow/base/notices.h"
#include "windrow/job/spec.h"
#include "windrow/pipeline/stage.h"
#include "windrow/report/ledger.h"
#include "windrow/units/units.h"

namespace windrow::engine {

/// Everything a field's adjustment needs apart from the run it is applied to.
struct Calibration {
  adjust::Setup setup;
  adjust::Steps steps;  ///< of the anchor run
  reach::ReachMap level, shape;
  reach::Drift drift;  ///< kriging-height: taken off station_level, added at the cells
  std::vector<double> station_level, station_shape;
  std::vector<double> mean_correction_level, mean_correction_shape;
  std::array<double, 12> lapse{};    ///< output units per metre
  std::vector<double> model_height;  ///< anchor's, on the mesh; empty without terrain
  std::vector<report::StationRecord> stations;
  bool period_mismatch = false;  ///< some station's years could not be matched
  std::size_t level_stations = 0, shape_stations = 0;
};

struct CalibrationNeeds {
  const job::JobSpec& job;
  const job::FieldSpec& field;
  const Target& target;
  const Source& anchor;
  const std::string& anchor_name;
  const units::Conversion& conversion;  ///< model units -> output units
  const std::string& output_units;
  const FixedField* model_height = nullptr;  ///< on the anchor's grid, with terrain
};

/// Error(data) when no station is left or years cannot be matched and the job says refuse.
Calibration calibrate(const CalibrationNeeds& needs, Notices& notices);

/// The calendar date a time step stands for: the middle of its bounds.
std::vector<calendar::Date> step_dates(const cf::RunVariable& variable);

/// Lapse rate of each month in output units per metre.
std::array<double, 12> lapse_in(const job::TerrainSpec& terrain, const std::string& output_units);

}  // namespace windrow::engine
