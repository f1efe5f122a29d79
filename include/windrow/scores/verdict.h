// What the adjustment is worth at places it has not seen: raw model, height adjustment alone and adjusted product
// against the observations, over stations, in numbers and in plain words.
#pragma once
#include <span>
#include <string>
#include <vector>

#include "windrow/scores/resample.h"

namespace windrow::scores {

/// One station and season, three times on the same days.
struct Versions {
  Sample raw, height, adjusted;
};
/// Days on which any of the four series is missing are left out of all.
Versions make_versions(const Days& days, const Season& season, const Options& options, std::span<const double> observed,
                       std::span<const double> raw, std::span<const double> height, std::span<const double> adjusted);

enum class Verdict { helps, no_clear_difference, harms, too_small };
std::string words(Verdict verdict);  ///< "helps", "no clear difference", "harms", "sample too small"

/// One score over all stations. Departures are means over stations of `departure(score, value)`; an improvement is the
/// departure of the other version minus that of the adjusted one.
struct Comparison {
  Score score;
  std::size_t stations;  ///< judged
  std::size_t left_out;  ///< fewer than kFewestYears well-sampled years, or without the score
  std::size_t years;     ///< that were drawn from: all years of the judged stations
  double raw, height, adjusted;
  double over_raw, over_height;
  Interval over_raw_interval, over_height_interval;
  /// By the interval of the improvement over height adjustment alone: helps above 0, harms below 0; too small where no
  /// station is left or the interval cannot be had.
  Verdict verdict;
};

/// One comparison for each score that applies to the first station. Years are drawn for all stations together, because
/// the stations' errors of one year are alike: drawn one by one they would make the interval too narrow. Stations
/// without a drawn year are missing from that replicate's means.
std::vector<Comparison> compare(std::span<const Versions> stations, const Resampling& resampling);

/// The scores a season's verdict rests on: bias and Perkins, for precipitation also wet-day frequency. The others are
/// shown, but among many scores one would clear zero by chance.
std::vector<Score> main_scores(Quantity quantity);
/// Harms where one of the main scores is harmed, else helps where one is helped; too small where all are.
Verdict overall(std::span<const Comparison> comparisons, Quantity quantity);

/// One line, e.g. "tas, DJF, bias: the adjustment helps: 0.41 K off instead of 2.13 K with height adjustment alone
/// (3.02 K raw); improvement 1.72 K, 90 % interval 1.35 to 2.06 K; 12 stations, 30 years". `units` are the field's.
std::string sentence(const Comparison& comparison, const std::string& field, const Season& season,
                     const std::string& units);
/// One line for the season; says so where the days of a free-running model do not correspond to observed ones.
std::string overall_sentence(std::span<const Comparison> comparisons, const std::string& field, const Season& season,
                             const Options& options);

}  // namespace windrow::scores
