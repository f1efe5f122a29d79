// Bias adjustment as a pointwise transfer: fitted at stations, carried as targets, evaluated per mesh cell.
// All model values here are *reduced*: value - lapse(month) * model height (zero lapse without [field.terrain]); station
// values likewise with the station's elevation; the cell's own lapse(month) * height is added after evaluation. So
// "heights first" and "targets with the height drift removed" (DEVELOPERS.md, "Adjustment") hold by construction.
// Multiplicative fields carry logarithms. Evaluation uses only + - * / and comparisons.
#pragma once
#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include "windrow/calendar/calendar.h"
#include "windrow/calendar/seasons.h"
#include "windrow/station/station.h"

namespace windrow::adjust {

enum class Method { mean_shift, mean_ratio, quantile_mapping };

struct Setup {
  Method method = Method::mean_shift;
  calendar::Seasons seasons;
  int quantiles = 100;      ///< nodes tau_k = (k + 1/2) / quantiles
  double max_ratio = 10;    ///< mean-ratio: cap of a season's ratio, and 1 / cap below
  bool carry_target = true;
  bool daily = true;        ///< model series is daily (else monthly: seasons are months)
  [[nodiscard]] bool multiplicative() const { return method == Method::mean_ratio; }
};

/// What every series on one run's time axis shares. Built once a run.
struct Steps {
  std::vector<std::int16_t> season;        ///< evaluation season of each step
  std::vector<std::int32_t> year;          ///< of each step
  std::vector<std::uint8_t> month;         ///< 0..11
  std::vector<std::int16_t> slot;          ///< row of the month-smoothing table (day of year, by year length); -1 unused
  std::vector<std::uint32_t> sample_start; ///< seasons + 1: CSR of calibration steps by season
  std::vector<std::uint32_t> sample;
  std::vector<std::uint8_t> in_period;     ///< step belongs to the calibration period
};
/// `dates`: one a step (the day, or a day inside the month). Error(data) when a season has no calibration step and
/// `calibrate` is set.
Steps make_steps(const Setup& setup, const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                 const std::optional<std::pair<calendar::Date, calendar::Date>>& period, bool calibrate,
                 const std::string& place);

/// The transfer at one station.
struct StationFit {
  bool level = false;   ///< all seasons have a level
  bool shape = false;   ///< all seasons have a shape (daily stations, quantile-mapping)
  std::string left_out; ///< why there is no level; empty otherwise
  int months_matched = 0;
  bool period_mismatch = false;          ///< normals without a common year with the run
  std::vector<double> target_level;      ///< [season]; log for multiplicative
  std::vector<double> correction_level;  ///< [season]
  std::vector<double> target_shape;      ///< [season * quantiles]: target(tau) - level
  std::vector<double> correction_shape;  ///< [season * quantiles]
};
/// `model`: the anchor run's reduced series at the station, NaN where missing. `reduction`: lapse(month) * elevation, 12
/// values subtracted from observations. Uses exactly the (year, month) pairs the station has; normals use the months of
/// normals_first..normals_last. accept_mismatch: where no common year exists, use the run's whole calibration period.
StationFit fit_station(const Setup& setup, const Steps& steps, std::span<const double> model,
                       const station::Record& record, const std::vector<double>& reduction,
                       std::pair<int, int> normals_period, bool accept_mismatch);

/// The anchor run's calibration climate at one place (shared by all mesh cells with the same pairings).
struct RowClimate {
  std::vector<double> mean;        ///< [season]
  std::vector<double> node;        ///< [season * quantiles], non-decreasing (quantile-mapping)
  std::vector<double> node_weight; ///< [season * quantiles]: mean interpolation weight over the calibration sample
  std::vector<double> slot_sum;    ///< mean-ratio by month, daily: calibration sum per slot
};
RowClimate fit_row(const Setup& setup, const Steps& steps, std::span<const double> series);

/// Where each value of a run's series stands in the anchor's calibration distribution.
struct Ranks {
  std::vector<std::uint16_t> node;  ///< lower node of the pair
  std::vector<float> weight;        ///< of the upper node, 0..1
  std::uint64_t below = 0, above = 0;  ///< values beyond the outermost nodes (tails)
};
void rank_series(const Setup& setup, const Steps& steps, const RowClimate& climate, std::span<const double> series,
                 Ranks& ranks);

/// Targets carried to one cell; spans of the seasons or seasons * quantiles.
struct CellTarget {
  std::span<const double> level;             ///< sum of shares * target_level (or correction_level with carry = correction)
  std::span<const double> shape;             ///< likewise; empty without shape
  std::span<const double> mean_correction_level;  ///< season's mean over stations, for cells beyond reach
  std::span<const double> mean_correction_shape;
  double fade_level = 1, fade_shape = 1;     ///< 1: targets; 0: mean correction
};

/// The cell's correction tables, ready for evaluation.
struct Correction {
  std::vector<double> table;   ///< mean methods: [season] or [slot]; quantile-mapping: [season * quantiles]
  int reordered = 0;           ///< nodes moved to keep targets non-decreasing (pool adjacent violators)
  int capped = 0;              ///< seasons whose ratio met max_ratio
};
/// With quantile-mapping the calibration mean is reset to the level after the shape.
void make_correction(const Setup& setup, const RowClimate& climate, const CellTarget& target, Correction& out);

/// out[t] = adjusted reduced value for all steps; NaN stays NaN. `ranks` only for quantile-mapping.
void evaluate(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
              const Correction& correction, std::span<double> out);

}  // namespace windrow::adjust
