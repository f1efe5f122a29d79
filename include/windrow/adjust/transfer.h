// Bias adjustment as a pointwise transfer: fitted at stations, carried as targets, evaluated per mesh cell.
// All model values here are *reduced*: value - lapse(month) * model height (zero lapse without [field.terrain]);
// station values likewise with the station's elevation; the cell's own lapse(month) * height is added after evaluation.
// So "heights first" and "targets with the height drift removed" (DEVELOPERS.md, "Adjustment") hold by construction.
// Multiplicative fields carry logarithms. Evaluation uses only + - * / and comparisons.
#pragma once
#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include "windrow/adjust/month_smoothing.h"
#include "windrow/calendar/calendar.h"
#include "windrow/calendar/seasons.h"
#include "windrow/station/station.h"

namespace windrow::adjust {

enum class Method { mean_shift, mean_ratio, quantile_mapping };

struct Setup {
  Method method = Method::mean_shift;
  calendar::Seasons seasons;
  int quantiles = 100;    ///< nodes tau_k = (k + 1/2) / quantiles, type 7 of Hyndman & Fan 1996; 2 at least
  double max_ratio = 10;  ///< mean-ratio: cap of a season's ratio, and 1 / cap below
  bool carry_target = true;
  bool daily = true;  ///< model series is daily (else monthly: seasons are months)
  [[nodiscard]] bool multiplicative() const { return method == Method::mean_ratio; }
  /// Monthly corrections of a mean method on daily data are smoothed to days (MonthSmoothing).
  [[nodiscard]] bool smoothed() const { return daily && seasons.is_month() && method != Method::quantile_mapping; }
};

/// What every series on one run's time axis shares. Built once a run.
struct Steps {
  std::vector<std::int16_t> season;  ///< evaluation season of each step
  std::vector<std::int32_t> year;    ///< of each step
  std::vector<std::uint8_t> month;   ///< 0..11
  std::vector<std::int16_t> slot;    ///< row of the month-smoothing table (day of year, by year length); -1 unused
  std::vector<std::uint32_t>
      sample_start;  ///< seasons + 1: CSR of calibration steps by season; zeros if not calibrating
  std::vector<std::uint32_t> sample;
  std::vector<std::uint32_t> member_start;  ///< likewise all steps by season (stations bring their own years)
  std::vector<std::uint32_t> member;
  std::vector<std::uint8_t> in_period;  ///< step belongs to the calibration period (all do without a period)
  std::shared_ptr<const MonthSmoothing> smoothing;  ///< null unless setup.smoothed()
};
/// `dates`: one a step (the day, or a day inside the month). The period counts whole days, both ends included.
/// Error(data) when a season has no calibration step and `calibrate` is set; Error(job) for monthly data with seasons
/// that are no months, or less than 2 quantiles.
Steps make_steps(const Setup& setup, const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                 const std::optional<std::pair<calendar::Date, calendar::Date>>& period, bool calibrate,
                 const std::string& place);

/// The transfer at one station.
struct StationFit {
  bool level = false;                    ///< all seasons have a level
  bool shape = false;                    ///< all seasons have a shape (daily stations, quantile-mapping)
  std::string left_out;                  ///< why there is no level; empty otherwise
  int months_matched = 0;                ///< (year, month) pairs of the run that stand against the station's values
  bool period_mismatch = false;          ///< nothing in common: the run's whole calibration period was used instead
  std::vector<double> target_level;      ///< [season]; log for multiplicative
  std::vector<double> correction_level;  ///< [season]
  std::vector<double> target_shape;      ///< [season * quantiles]: target(tau) - level
  std::vector<double> correction_shape;  ///< [season * quantiles]
};
/// `model`: the anchor run's reduced series at the station, NaN where missing. `reduction`: lapse(month) * elevation,
/// 12 values subtracted from observations (empty: zero). target(tau) = Q_model(tau; calibration) + Q_observed(tau) -
/// Q_model(tau; matched): matched are exactly the (year, month) pairs that both station and run have, inside the
/// calibration period or not; whoever wants fewer (split periods) takes them out of the record. Months the run has only
/// in part (more than a day short) do not count. Monthly values: a season's mean weighs every pair by the days of its
/// calendar month (365-day year) that lie in the season, on both sides. Seasons that the series lacks are taken from
/// normals: model means over the run's months within normals_period; if the run does not have all twelve, over its
/// calibration period (period_mismatch, whatever accept_mismatch says). accept_mismatch: a series without any common
/// month is set against the whole calibration period likewise; else the station is left out, and says so.
/// Multiplicative: an observed mean of zero counts as the ratio 1 / max_ratio; a model mean of zero leaves the station
/// out.
StationFit fit_station(const Setup& setup, const Steps& steps, std::span<const double> model,
                       const station::Record& record, const std::vector<double>& reduction,
                       std::pair<int, int> normals_period, bool accept_mismatch);

/// The anchor run's calibration climate at one place (shared by all mesh cells with the same pairings).
struct RowClimate {
  std::vector<double> mean;         ///< [season]
  std::vector<double> node;         ///< [season * quantiles], non-decreasing (quantile-mapping)
  std::vector<double> node_weight;  ///< [season * quantiles]: mean interpolation weight over the calibration sample
  std::vector<double> slot_sum;     ///< mean-ratio by month, daily: calibration sum per slot
  std::shared_ptr<const MonthSmoothing> smoothing;  ///< the steps'
};
/// A season without any value has NaN mean and nodes. `series` has one value a step.
RowClimate fit_row(const Setup& setup, const Steps& steps, std::span<const double> series);

/// Where each value of a run's series stands in the anchor's calibration distribution. A value equal to several nodes
/// (dry days) stands in the middle of them.
struct Ranks {
  std::vector<std::uint16_t> node;  ///< lower node of the pair, 0..quantiles - 2
  std::vector<float> weight;        ///< of the upper node, 0..1
  std::vector<std::uint8_t> tail;   ///< 1 where the value lies beyond the outermost nodes
};
void rank_series(const Setup& setup, const Steps& steps, const RowClimate& climate, std::span<const double> series,
                 Ranks& ranks);

/// Targets carried to one cell; spans of the seasons or seasons * quantiles.
struct CellTarget {
  std::span<const double> level;  ///< sum of shares * target_level (or correction_level with carry = correction)
  std::span<const double> shape;  ///< likewise; empty without shape
  std::span<const double> mean_correction_level;  ///< season's mean over stations, for cells beyond reach
  std::span<const double> mean_correction_shape;
  double fade_level = 1, fade_shape = 1;  ///< 1: targets; 0: mean correction; between: fade * target + (1 - fade) *
                                          ///< (own climate + mean correction), for ratios too (not in logarithms)
};

/// The cell's correction tables, ready for evaluation.
struct Correction {
  std::vector<double> table;  ///< mean methods: [season] or [slot]; quantile-mapping: [season * quantiles]
  int reordered = 0;          ///< nodes moved to keep targets non-decreasing (pool adjacent violators)
  int capped = 0;             ///< seasons whose ratio met max_ratio, or whose own mean is not positive (ratio 1)
};
/// With quantile-mapping the calibration mean is reset to the level after the shape. mean-shift smoothed to days keeps
/// the mean of a month's days (calibration means are exact where all days have values); mean-ratio is rescaled per
/// month by slot_sum, so that calibration totals are exact. Where a month has no climate, monthly values are not
/// smoothed.
void make_correction(const Setup& setup, const RowClimate& climate, const CellTarget& target, Correction& out);

/// out[t] = adjusted reduced value for all steps; NaN stays NaN. `ranks` only for quantile-mapping. Error(defect) when
/// a smoothed table was made for another calendar's days.
void evaluate(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
              const Correction& correction, std::span<double> out);

}  // namespace windrow::adjust
