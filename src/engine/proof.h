// What the adjustment makes of places whose station, or whose years, it has not seen. Series only; their scores are
// made in proof_scores.h. Private to the engine.
#pragma once
#include <string>
#include <vector>

#include "calibration.h"
#include "windrow/scores/split.h"

namespace windrow::engine {

/// What a fit does not see. Stations: none is left out, each in turn, or blocks of neighbouring ones; with a station
/// left out go all within scores::kSameSite_m of it. Years: fitted to one half and scored in the other, then the other
/// way round.
struct Design {
  enum class Stations { all, one_out, blocks_out } stations = Stations::one_out;
  enum class Years { all, odd_and_even, halves } years = Years::all;
  [[nodiscard]] std::string name()
      const;  ///< "each station left out", "blocks of stations and odd or even years left out"
};

/// Series [placed station][step of the anchor run] in output units; NaN where the design makes none.
struct ProofSeries {
  std::vector<std::vector<double>> raw, height, adjusted;  ///< all three missing where one is
};

/// Makes the series of any design. A station is a place like a cell of the mesh: its model value is that of the source
/// cell that holds it, its height its own elevation. Repeated without the stations left out: lapse fit, height drift,
/// variogram and means of corrections. (The rules that leave values and stations out of a job look at one station at a
/// time, so that they need no repetition.)
class ProofMaker {
 public:
  ProofMaker(const CalibrationNeeds& needs, const Gathered& gathered, int threads)
      : needs_(needs), gathered_(gathered), threads_(threads) {}

  /// Years that both the run and some station's series have, ascending; split periods need at least two.
  [[nodiscard]] std::vector<int> years() const;
  /// The block of each placed station.
  [[nodiscard]] std::vector<int> blocks() const;
  /// Error(data) when a lapse cannot be fitted without the stations left out.
  [[nodiscard]] ProofSeries series(const Design& design) const;

 private:
  struct Fold;
  void make(const Fold& fold, const scores::StationSplit& split, ProofSeries& out) const;
  [[nodiscard]] std::vector<scores::StationSplit> station_splits(Design::Stations stations) const;

  const CalibrationNeeds& needs_;
  const Gathered& gathered_;
  int threads_;
};

}  // namespace windrow::engine
