// Stations meet the anchor run: records, transfers, reach. Private to the engine.
#pragma once
#include <array>
#include <string>
#include <vector>

#include "carrying.h"
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
  adjust::Steps steps;             ///< of the anchor run
  Carried carried;                 ///< to the mesh cells
  std::array<double, 12> lapse{};  ///< output units per metre
  std::vector<report::StationRecord> stations;
  bool period_mismatch = false;  ///< some station's years could not be matched
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

/// Stations with their place in the anchor run; nothing is fitted yet.
struct Gathered {
  adjust::Setup setup;
  adjust::Steps steps;                      ///< of the anchor run
  std::vector<station::Record> records;     ///< `placed` points into them
  std::vector<Placed> placed;               ///< at least one
  std::vector<std::vector<double>> series;  ///< one a placed station: the anchor's, output units, at the model's height
  std::vector<report::StationRecord> left_out;

  Gathered() = default;
  Gathered(Gathered&&) = default;
  Gathered& operator=(Gathered&&) = default;
};
/// Error(data) when no station is left.
Gathered gather(const CalibrationNeeds& needs, Notices& notices);

/// The lapse the job gives, or fitted to the stations `chosen` (positions in gathered.series) with their records in
/// `placed`; zero without [field.terrain].
std::array<double, 12> lapse_of(const CalibrationNeeds& needs, const Gathered& gathered,
                                const std::vector<Placed>& placed, const std::vector<std::size_t>& chosen,
                                Notices& notices);

/// series - lapse * height, by month.
std::vector<double> reduced(const std::vector<double>& series, const adjust::Steps& steps,
                            const std::array<double, 12>& lapse, double height_m);

/// The transfer at one station.
adjust::StationFit fit_placed(const CalibrationNeeds& needs, const Gathered& gathered, const Placed& placed,
                              const std::vector<double>& series, const std::array<double, 12>& lapse);

/// The stations that give a level, and what became of each. Error(data) when none does.
std::vector<Fitted> fit_all(const CalibrationNeeds& needs, const Gathered& gathered,
                            const std::array<double, 12>& lapse, std::vector<report::StationRecord>& outcomes,
                            Notices& notices);

[[noreturn]] void no_shape(const CalibrationNeeds& needs);  ///< Error(data): no station has what the method needs

/// Error(data) when no station is left or years cannot be matched and the job says refuse.
Calibration calibrate(const CalibrationNeeds& needs, Notices& notices);

/// The calendar date a time step stands for: the middle of its bounds.
std::vector<calendar::Date> step_dates(const cf::RunVariable& variable);

/// Lapse rate of each month in output units per metre.
std::array<double, 12> lapse_in(const job::TerrainSpec& terrain, const std::string& output_units);

}  // namespace windrow::engine
