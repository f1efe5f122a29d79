// Bias adjustment as a pointwise transfer: fitted at stations, carried as targets, evaluated per mesh cell.
// All model values here are *reduced*: value - lapse(month) * model height (zero lapse without [field.terrain]);
// station values likewise with the station's elevation; the cell's own lapse(month) * height is added after evaluation.
// So "heights first" and "targets with the height drift removed" (DEVELOPERS.md, "Adjustment") hold by construction.
#pragma once
#include <cstdint>
#include <span>
#include <string>
#include <utility>
#include <vector>

#include "windrow/adjust/draws.h"
#include "windrow/adjust/setup.h"
#include "windrow/station/station.h"

namespace windrow::adjust {

/// The transfer at one station.
struct StationFit {
  bool level = false;                    ///< all seasons have a level
  bool shape = false;                    ///< all seasons have a shape (daily stations, where there is one)
  std::string left_out;                  ///< why there is no level; empty otherwise
  int months_matched = 0;                ///< (year, month) pairs of the run that stand against the station's values
  bool period_mismatch = false;          ///< nothing in common: the run's whole calibration period was used instead
  std::vector<double> target_level;      ///< [season]; log for multiplicative
  std::vector<double> correction_level;  ///< [season]
  std::vector<double> target_shape;      ///< [season * width]: target(tau) - level; frequency and deviation as they are
  std::vector<double> correction_shape;  ///< [season * width]
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
  std::vector<double> deviation;    ///< [season]: standard deviation (n - 1), with variance-scaling
  std::vector<double> node;         ///< [season * quantiles], non-decreasing (additive quantile methods)
  std::vector<double> node_weight;  ///< [season * quantiles]: mean interpolation weight over the calibration sample
  std::vector<std::vector<double>> sample;          ///< [season], ascending: where wet and dry days are told apart
  std::vector<double> slot_sum;                     ///< mean-ratio by month, daily: calibration sum per slot
  std::shared_ptr<const MonthSmoothing> smoothing;  ///< the steps'
};
/// A season without any value has NaN mean and nodes. `series` has one value a step.
RowClimate fit_row(const Setup& setup, const Steps& steps, std::span<const double> series);

/// Where each value of a run's series stands: in the anchor's calibration distribution, or (quantile-delta-mapping) in
/// that of the run's own window. A value equal to several nodes (dry days) stands in the middle of them.
struct Ranks {
  std::vector<std::uint16_t> node;  ///< lower node of the pair, 0..quantiles - 2
  std::vector<float> weight;        ///< of the upper node, 0..1
  std::vector<std::uint8_t> tail;   ///< 1 below the outermost nodes, 2 above, in the anchor's distribution; else 0
  /// Where wet and dry days are told apart. quantile-delta-mapping: fractional place in the ascending `sample` of the
  /// step's window * seasons + season (0 the smallest value, ties in the middle). detrended-quantile-mapping: the
  /// window's mean over the calibration's.
  std::vector<double> place, change;
  std::vector<std::vector<double>> sample;
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
  std::vector<double> table;        ///< mean methods: [season] or [slot]; quantile methods: [season * quantiles];
                                    ///< variance-scaling: [season * 2], factor and offset
  std::vector<double> threshold;    ///< [season]: what is wet (wet_days()); the anchor's own distribution decides it
  std::vector<double> dry_factor;   ///< [season]: 1 where dry days keep their values, 0 where they become zero
  std::vector<double> node;         ///< [season * quantiles]: the model's wet nodes, where values are looked up in them
  std::vector<double> drawn_share;  ///< [season]: share of drawn days among the wet ones
  std::vector<std::vector<double>> drawn_below;  ///< [season], ascending: the random field on the calibration days
                                                 ///< made wet; a dry day below the last of them is made wet
  std::vector<double> drawn_amount;  ///< [season * quantiles]: what such a day gets, by its place among them
  int reordered = 0;                 ///< nodes moved to keep targets non-decreasing (pool adjacent violators)
  int capped = 0;                    ///< seasons or nodes whose ratio met max_ratio, or whose own mean is not positive
};
/// With quantile methods the calibration mean is reset to the level after the shape. mean-shift smoothed to days keeps
/// the mean of a month's days (calibration means are exact where all days have values); mean-ratio is rescaled per
/// month by slot_sum, so that calibration totals are exact. Where a month has no climate, monthly values are not
/// smoothed. Wet days: the threshold is the value that leaves the target's share of the calibration days above it, but
/// no lower than wet_day / max_ratio; what is missing then is drawn among the dry days by `draws` (the cell's random
/// field on the anchor's steps, see Draws; null: no days are made wet). Where the model has too many wet days or too
/// few, all others become zero; else dry days keep their values. Targets of wet days are at least wet_day.
void make_correction(const Setup& setup, const Steps& anchor_steps, const RowClimate& climate,
                     std::span<const double> anchor_series, const CellTarget& target, const CellDraws* draws,
                     Correction& out);

/// out[t] = adjusted reduced value for all steps; NaN stays NaN. `draws`: the cell's random field on the run's steps.
/// Error(defect) when a smoothed table was made for another calendar's days.
void evaluate(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
              const Correction& correction, const CellDraws* draws, std::span<double> out);

}  // namespace windrow::adjust
