// Scores of a modelled daily series against an observed one at one station, season by season. How sure a score is
// stands in resample.h; what it means for the adjustment in verdict.h.
#pragma once
#include <array>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "windrow/scores/season.h"

namespace windrow::scores {

/// Values are finite or NaN (missing). Only days on which both series have a value take part in any score. "Over years"
/// is the mean over the season's complete years: at most 3 days missing a month of the season and at most 15 in all
/// (limits of common practice for the ETCCDI indices: 3 for a monthly, 15 for an annual value; from memory).
enum class Score {
  bias,                    ///< mean modelled minus mean observed
  mean_absolute_error,     ///< of days; only where days correspond (Options::paired)
  root_mean_square_error,  ///< of days; only where days correspond
  variance_ratio,          ///< modelled over observed, of days, n - 1
  percentile_5,            ///< this and the next three: difference of quantiles, type 7 of Hyndman & Fan 1996
  percentile_50,
  percentile_95,
  percentile_99,
  wet_day_frequency,  ///< difference of the shares of days with at least Options::wet_day; precipitation
  perkins,            ///< Perkins et al. 2007 (J. Climate 20:4356): sum of the smaller of both shares over bins
  autocorrelation,    ///< difference of the correlations of each day with the day before it in the same season and year
  longest_dry_spell,  ///< difference; days in a row below Options::wet_day within the season, over years; precipitation
  yearly_maximum,     ///< difference; ETCCDI TXx (of tasmax) or Rx1day (of precipitation), over years
  yearly_minimum      ///< difference; ETCCDI TNn (of tasmin), over years; temperature
};
inline constexpr std::size_t kScores = 14;
std::string name(Score score);  ///< in plain words: "bias", "95th percentile"
double perfect(Score score);    ///< the value of a perfect series: 0 or 1
/// How far a value is from perfect: |value|, for the variance ratio |ln value|, for Perkins 1 - value. NaN stays.
double departure(Score score, double value);

enum class Quantity { temperature, precipitation };

struct Options {
  Quantity quantity = Quantity::temperature;
  bool paired = false;   ///< modelled days correspond to observed ones: a reanalysis, not a free-running model
  double wet_day = 1.0;  ///< mm/day: a day with at least this is wet
  /// Bins [k width, (k+1) width) of the Perkins score: 0.5 K (degC), 1 mm/day as in the paper (from memory); dry days
  /// are part of the first bin.
  [[nodiscard]] double bin_width() const { return quantity == Quantity::temperature ? 0.5 : 1.0; }
};

/// NaN where a score does not apply or cannot be had. `observed` and `modelled` are what is compared (means for the
/// bias), NaN for the errors of days and for Perkins; `value` is the score.
struct Value {
  double observed, modelled, value;
};
using Values = std::array<Value, kScores>;
inline const Value& at(const Values& values, Score score) { return values[static_cast<std::size_t>(score)]; }

/// One season of both series, summed so that the scores of any choice of years cost little.
class Sample {
 public:
  /// Both series in the order of `days` (Error(defect) otherwise); temperature in K or degC, precipitation in mm/day.
  Sample(const Days& days, const Season& season, const Options& options, std::span<const double> observed,
         std::span<const double> modelled);

  [[nodiscard]] const std::vector<int>& years() const { return years_; }  ///< with at least one day, ascending
  [[nodiscard]] std::size_t days() const { return observed_.value.size(); }
  [[nodiscard]] int well_sampled_years() const { return well_sampled_; }  ///< with at least half of the season's days
  [[nodiscard]] bool has(Score score) const;                              ///< applies to this quantity and pairing

  [[nodiscard]] Values scores() const;  ///< every year once
  /// times[i] is how often year i of years() is taken (Error(defect) unless one count a year).
  [[nodiscard]] Values scores(std::span<const int> times) const;

 private:
  /// One year of one series; sums are of values less the series' median.
  struct Year {
    double sum = 0, squares = 0;
    int wet = 0;
    double before = 0, after = 0, before_squares = 0, after_squares = 0, products = 0;  // pairs of consecutive days
    int spell = 0;
    double highest = 0, lowest = 0;
  };
  struct Series {
    double centre = 0;
    std::vector<double> value;          // ascending
    std::vector<std::size_t> year;      // of each value: position in years_
    std::vector<std::uint32_t> before;  // block of values x year: values of that year in the blocks before; all at last
    std::vector<Year> sums;
    std::vector<int> bins;  // bin x year: days
  };
  struct Common {  // one year of both series
    int days = 0, pairs = 0;
    double errors = 0, absolute = 0, squares = 0;
    bool complete = false;
  };

  void add_up(Series& series, const Days& days, const std::vector<std::size_t>& taken, std::span<const double> values);
  void make_bins();
  void quantiles(const Series& series, std::span<const int> times, std::array<double, 4>& out) const;
  void mean_and_spread(std::span<const int> times, Values& out) const;
  void frequencies(std::span<const int> times, Values& out) const;
  void over_years(std::span<const int> times, Values& out) const;
  [[nodiscard]] double autocorrelation(const Series& series, std::span<const int> times) const;

  Options options_;
  std::vector<int> years_;
  std::vector<Common> common_;
  std::vector<std::size_t> year_of_taken_;
  int well_sampled_ = 0;
  Series observed_, modelled_;
};

}  // namespace windrow::scores
