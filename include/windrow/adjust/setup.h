// What a field's adjustment is asked to be, and what all series on one run's time axis share. No values here.
#pragma once
#include <cstdint>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "windrow/adjust/month_smoothing.h"
#include "windrow/calendar/calendar.h"
#include "windrow/calendar/seasons.h"

namespace windrow::adjust {

/// x: the run's value; o observed, m modelled; F a distribution function, h the anchor's calibration period, p the
/// run's own window; tau = F(x).
///   mean_shift                   x + (mean o - mean m)                            Teutschbein & Seibert 2012, eq. 4
///   mean_ratio                   x * (mean o / mean m)                            ibid., eq. 3
///   variance_scaling             (x - mean m) sd o / sd m + mean o                ibid., eqs. 9-13
///   quantile_mapping             F_oh^-1(F_mh(x))                                 Themessl et al. 2012, eqs. 1-2
///   detrended_quantile_mapping   the same with the window's mean set to the calibration's before and back after it:
///                                x - d -> map -> + d (or x / d -> map -> * d)     Cannon et al. 2015, eqs. 3-4
///   quantile_delta_mapping       tau = F_mp(x); x + F_oh^-1(tau) - F_mh^-1(tau), or x * F_oh^-1(tau) / F_mh^-1(tau)
///                                                                                 ibid., eqs. 5-10
///   gamma_mapping                quantile_mapping on wet days with gamma distributions on both sides
///                                                                                 Piani et al. 2010, eqs. 1-4
/// Equation numbers from memory. Between stations the observed side is the cell's target (DEVELOPERS.md, "Adjustment").
enum class Method {
  mean_shift,
  mean_ratio,
  variance_scaling,
  quantile_mapping,
  detrended_quantile_mapping,
  quantile_delta_mapping,
  gamma_mapping
};

struct Setup {
  Method method = Method::mean_shift;
  bool ratio_form = false;  ///< multiplicative: levels and shapes are carried as logarithms
  calendar::Seasons seasons;
  int quantiles = 100;    ///< nodes tau_k = (k + 1/2) / quantiles, type 7 of Hyndman & Fan 1996; 2 at least
  double max_ratio = 10;  ///< cap of a ratio, and 1 / cap below
  double wet_day = 0;     ///< multiplicative: days from here on are wet, in output units; 0: wet-day frequency is left
                          ///< alone, and every value above zero counts as wet
  int window_years = 30, window_step = 10;  ///< the run's own windows (quantile-delta-, detrended-quantile-mapping)
  bool carry_target = true;
  bool daily = true;  ///< model series is daily (else monthly: seasons are months)

  [[nodiscard]] bool multiplicative() const { return ratio_form || method == Method::mean_ratio; }
  [[nodiscard]] bool maps_quantiles() const { return method >= Method::quantile_mapping; }
  /// Wet and dry days are told apart: multiplicative quantile methods, and mean-ratio with a wet-day threshold.
  [[nodiscard]] bool wet_days() const { return multiplicative() && (maps_quantiles() || wet_day > 0); }
  /// The run's own windows are looked at.
  [[nodiscard]] bool windowed() const {
    return method == Method::quantile_delta_mapping || method == Method::detrended_quantile_mapping;
  }
  /// Monthly corrections of a mean method on daily data are smoothed to days (MonthSmoothing).
  [[nodiscard]] bool smoothed() const {
    return daily && seasons.is_month() && method <= Method::mean_ratio && !wet_days();
  }
  /// Values of a shape in one season: the logit of the wet-day frequency where that is adjusted, then the nodes; with
  /// variance-scaling the logarithm of the standard deviation. 0: the level is all there is.
  [[nodiscard]] std::size_t width() const {
    if (method == Method::variance_scaling) return 1;
    return first_node() + (maps_quantiles() ? static_cast<std::size_t>(quantiles) : 0);
  }
  [[nodiscard]] std::size_t first_node() const { return wet_days() && wet_day > 0 ? 1 : 0; }
  [[nodiscard]] std::size_t season_count() const { return static_cast<std::size_t>(seasons.count()); }
};

/// Steps by group as compressed rows, ascending within each.
struct StepGroups {
  std::vector<std::uint32_t> start;  ///< groups + 1
  std::vector<std::uint32_t> step;
};

/// What every series on one run's time axis shares. Built once a run.
struct Steps {
  std::vector<calendar::Date> date;     ///< of each step
  std::vector<std::int16_t> season;     ///< evaluation season of each step
  std::vector<std::int32_t> year;       ///< of each step
  std::vector<std::uint8_t> month;      ///< 0..11
  std::vector<std::int16_t> slot;       ///< row of the month-smoothing table (day of year, by year length); -1 unused
  StepGroups sample;                    ///< calibration steps by season; nothing if not calibrating
  StepGroups member;                    ///< likewise all steps by season (stations bring their own years)
  std::vector<std::uint8_t> in_period;  ///< step belongs to the calibration period (all do without a period)
  std::shared_ptr<const MonthSmoothing> smoothing;  ///< null unless setup.smoothed()
  std::vector<std::int16_t> window;  ///< of each step: which of the run's own windows it is seen in; empty unless used
  StepGroups window_sample;          ///< steps by window * seasons + season
  std::vector<std::pair<int, int>> window_years;  ///< first and last year of each window
};
/// `dates`: one a step (the day, or a day inside the month). The period counts whole days, both ends included.
/// Error(data) when a season has no calibration step and `calibrate` is set; Error(job) for monthly data with seasons
/// that are no months, or less than 2 quantiles.
Steps make_steps(const Setup& setup, const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                 const std::optional<std::pair<calendar::Date, calendar::Date>>& period, bool calibrate,
                 const std::string& place);

/// The run's own windows: blocks of `step` years, counted from the run's first year, each in the middle of a window of
/// `width` years that is shifted inside the complete blocks. Years after the last complete block are seen in its
/// window, so that a growing run changes nothing until a block is complete. A run of less than `width` years, or
/// without a complete block, has one window: all its years.
struct YearWindows {
  std::vector<std::pair<int, int>> years;  ///< first and last year of each window
  int first_year = 0, step = 1;
  [[nodiscard]] std::size_t of(int year) const {
    const auto block = static_cast<std::size_t>((year - first_year) / step);
    return block < years.size() ? block : years.size() - 1;
  }
};
YearWindows year_windows(int first_year, int last_year, int width, int step);

}  // namespace windrow::adjust
