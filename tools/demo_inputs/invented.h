// Everything that is invented about the island of Kelder, its climate and its two models: all constants of the demo.
// The island does not exist; at its place (46-50 N, 32-24 W) is open ocean. No code lives here.
#pragma once
#include <array>
#include <cstdint>

namespace demo {

// Where the island is, and how large: an ellipse about its centre, highest at one summit.
inline constexpr double kCentreLon = -28, kCentreLat = 48;         // degrees
inline constexpr double kHalfWidth_km = 75, kHalfLength_km = 120;  // east-west, north-south
inline constexpr double kDome_m = 900, kSummit_m = 900;
inline constexpr double kSummitEast_km = -15, kSummitNorth_km = 30, kSummitReach_km = 22;

// The true climate. Temperature at sea level in degC, rain as a latent normal variate that is wet above a threshold.
inline constexpr int kFirstYear = 1981, kLastYear = 2010;
inline constexpr double kMeanTemperature = 12.5;        // at 48 N, annual, without trend
inline constexpr double kTemperaturePerDegree = -0.45;  // per degree of latitude
inline constexpr double kSeasonAmplitude = 4.5;         // K
inline constexpr double kWarmestDay = 222;              // day of the year (10 August)
inline constexpr double kWeatherDeviation = 2.4;        // K, of daily weather
inline constexpr double kLapse = -0.0065;               // K per metre
inline constexpr double kForcedTrend = 0.3;             // K per decade, from the first day on
inline constexpr double kForcedRainTrend = 0.02;        // share per decade
inline constexpr double kWetThreshold = -0.1;           // of the latent variate, annual mean
inline constexpr double kWetThresholdSeason = 0.35;     // higher in summer by this
inline constexpr double kRainScale = 3.4;               // mm/day: amount = scale * (excess + 0.8 * excess^2)
inline constexpr double kRainPerMetre = 0.0007;         // share more rain a metre of height

// How the weather hangs together: spacing of its nodes in degrees, and correlation from day to day.
inline constexpr double kTemperatureNodes = 4, kTemperatureMemory = 0.8;
inline constexpr double kRainNodes = 1.5, kRainMemory = 0.45;

/// An invented climate model: its grid, its manners, and the errors that the adjustment is to find.
struct Model {
  const char* name;
  const char* title;
  std::uint64_t seed;        // its own weather: a free-running model does not know the day's real weather
  double west, south, step;  // degrees; cells are step x step
  int columns, rows;
  bool noleap, packed, descending, east_positive;  // 365-day years; shorts; north first; longitudes 0..360
  double bias, bias_season;                        // K: model minus truth, mean and amplitude with the season
  double deviation_factor;                         // weather too lively or too tame
  double rain_factor;                              // model rain / true rain
  double threshold_shift;                          // of the latent variate: negative is too much drizzle
};
inline constexpr std::array<Model, 2> kModels{{
    {"heron", "heron, an invented model on 1 degree cells", 101, -40, 40, 1, 24, 16, false, false, false, false, 1.5,
     0.8, 1.25, 0.75, -0.3},
    {"plover", "plover, an invented model on 5 degree cells", 202, -40, 40, 5, 5, 4, true, true, true, true, -2.0, -1.0,
     0.85, 1.35, -0.5},
}};

// The stations: seed of the true weather, and what their records suffer from.
inline constexpr std::uint64_t kTrueWeatherSeed = 3;
inline constexpr int kStations = 25;
inline constexpr double kStationSpacing_km = 11;
inline constexpr double kLocalDeviation = 0.5;  // K, independent from station to station and day to day
inline constexpr double kMissingShare = 0.003;  // single days
inline constexpr int kOutageDays = 40, kOutageEveryDays = 1500;
inline constexpr std::array<const char*, kStations> kStationNames{
    "Aldwick",  "Barnhaven",  "Coldmere",   "Dunmarra", "Esterholm",  "Fennick",  "Garvepoint",
    "Hallowby", "Inverlet",   "Jarrowhead", "Kelderby", "Longstrand", "Morrick",  "Netherfell",
    "Oxmoor",   "Pellan",     "Quernside",  "Ravensey", "Skerrow",    "Tarnmoor", "Ullenwick",
    "Varley",   "Westersund", "Yarrowdale", "Zealby"};

}  // namespace demo
