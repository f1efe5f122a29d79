// Scores of one field and family: days by season, means of months, points and areas. Numbers only; their wording is in
// proof_text.h. Private to the engine.
#pragma once
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "proof.h"
#include "windrow/scores/areas.h"
#include "windrow/scores/monthly.h"
#include "windrow/scores/verdict.h"

namespace windrow::engine {

/// One version of the field beside the observations; station by station, and over all.
struct MonthColumn {
  std::string version;                       ///< "raw", "height alone", "adjusted", ...
  std::vector<scores::MonthMeans> stations;  ///< one a placed station
  scores::MonthErrors errors;
};

struct StationScores {
  std::size_t station;  ///< placed one
  scores::Values raw, height;
  scores::SeasonScores adjusted;
};
struct SeasonScores {
  scores::Season season;
  std::vector<StationScores> stations;          ///< those with daily series; intervals in the verdict's design only
  std::vector<scores::Comparison> comparisons;  ///< where each station is left out, and where the verdict rests
};

struct DesignScores {
  Design design;
  std::vector<MonthColumn> months;    ///< raw, height alone, references (each station left out), adjusted
  std::vector<SeasonScores> seasons;  ///< the quarters and the year; empty without daily series
};

struct PointsAndAreas {
  struct Likeness {
    scores::Season season;
    std::vector<scores::CorrelationBin> bins;
  };
  std::vector<Likeness> likeness;
  std::vector<std::pair<std::string, scores::AreaScores>> areas;  ///< season and group; precipitation only
};

struct FieldProof {
  std::string field, family, run;
  std::string units;                  ///< of differences of monthly means
  std::string score_units;            ///< of the scores of days: K, mm/day, or the field's
  std::vector<std::string> stations;  ///< placed ones
  std::vector<int> years;             ///< that can be split
  scores::Options options;
  std::vector<DesignScores> designs;
  std::size_t verdict = 0;  ///< the design that the verdict rests on
  PointsAndAreas points;
};

/// Error(data) with fewer than two stations at different sites.
FieldProof prove_field(const CalibrationNeeds& needs, const std::string& family, int threads, Notices& notices,
                       const std::function<void(const std::string&)>& step);

}  // namespace windrow::engine
