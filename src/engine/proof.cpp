#include "proof.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <exception>
#include <limits>
#include <mutex>
#include <numeric>

#include "adjust_setup.h"
#include "windrow/base/error.h"
#include "windrow/os/process.h"
#include "windrow/pipeline/cell.h"

namespace windrow::engine {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
/// Blocks hold at least three stations where there are so few, and a tenth of them all where there are many.
constexpr int kMostBlocks = 10, kStationsPerBlock = 3;

}  // namespace

std::string Design::name() const {
  const std::string who = stations == Stations::one_out      ? "each station"
                          : stations == Stations::blocks_out ? "blocks of stations"
                                                             : "";
  const std::string when = years == Years::odd_and_even ? "odd or even years"
                           : years == Years::halves     ? "the first or second half of the years"
                                                        : "";
  return who + (who.empty() || when.empty() ? "" : " and ") + when + (who.empty() && when.empty() ? "nothing" : "") +
         " left out";
}

/// Everything a fold's splits share: the records of the years it fits, and transfers where they need no other station.
struct ProofMaker::Fold {
  std::vector<station::Record> records;  ///< empty: the gathered ones
  std::vector<Placed> placed;
  std::vector<std::uint8_t> scored;  ///< of each step
  std::vector<Fitted> fitted;        ///< one a placed station; empty where the lapse must be fitted anew
  std::shared_ptr<const adjust::Draws> draws;
};

std::vector<int> ProofMaker::years() const {
  std::vector<int> run(gathered_.steps.year.begin(), gathered_.steps.year.end());
  run.erase(std::unique(run.begin(), run.end()), run.end());
  std::vector<int> out;
  for (const Placed& placed : gathered_.placed) {
    for (const auto& value : placed.record->monthly) {
      if (std::binary_search(run.begin(), run.end(), value.year)) out.push_back(value.year);
    }
  }
  std::sort(out.begin(), out.end());
  out.erase(std::unique(out.begin(), out.end()), out.end());
  return out;
}

std::vector<int> ProofMaker::blocks() const {
  std::vector<GeoPoint> positions;
  for (const Placed& placed : gathered_.placed) positions.push_back(placed.record->site.position);
  const int count = static_cast<int>(positions.size());
  const int wanted = std::min(count, std::clamp(count / kStationsPerBlock, 2, kMostBlocks));
  return scores::spatial_blocks(positions, wanted);
}

std::vector<scores::StationSplit> ProofMaker::station_splits(Design::Stations stations) const {
  const auto& placed = gathered_.placed;
  const auto distance = [&placed](std::size_t i, std::size_t k) {
    return reach::distance_m(placed[i].record->site.position, placed[k].record->site.position);
  };
  if (stations == Design::Stations::one_out) return scores::leave_one_out(placed.size(), distance);
  if (stations == Design::Stations::blocks_out) return scores::leave_blocks_out(blocks(), distance);
  scores::StationSplit all;
  all.scored.resize(placed.size());
  std::iota(all.scored.begin(), all.scored.end(), std::size_t{0});
  all.fitted = all.scored;
  return {all};
}

void ProofMaker::make(const Fold& fold, const scores::StationSplit& split, ProofSeries& out) const {
  const auto& setup = gathered_.setup;
  const auto& steps = gathered_.steps;
  if (split.fitted.empty()) return;
  Notices unheard;  // of fits that are no part of the job
  const auto lapse = lapse_of(needs_, gathered_, fold.placed, split.fitted, unheard);
  std::vector<Fitted> own;
  if (fold.fitted.empty()) {
    for (const std::size_t i : split.fitted) {
      const Placed& placed = fold.placed[i];
      own.push_back({placed.record, fit_placed(needs_, gathered_, placed, gathered_.series[i], lapse)});
    }
  }
  std::vector<const Fitted*> fitted;
  bool shape = false;
  for (std::size_t k = 0; k < split.fitted.size(); ++k) {
    const Fitted& one = fold.fitted.empty() ? own[k] : fold.fitted[split.fitted[k]];
    if (!one.fit.level) continue;
    fitted.push_back(&one);
    shape = shape || one.fit.shape;
  }
  if (fitted.empty() || (setup.width() > 0 && !shape)) return;
  std::vector<GeoPoint> places;
  std::vector<double> elevation;
  for (const std::size_t i : split.scored) {
    places.push_back(fold.placed[i].record->site.position);
    elevation.push_back(fold.placed[i].record->site.elevation_m);
  }
  const Carried carried = carry_over(needs_.job, needs_.field, setup, fitted, places, unheard);
  pipeline::AdjustInput adjust;
  adjust.setup = setup;
  adjust.anchor_steps = steps;
  adjust.missing_beyond = needs_.job.reach.beyond == job::Beyond::missing;
  hand_over(carried, elevation, adjust);
  adjust.anchor_draws = adjust.run_draws = fold.draws;
  if (fold.draws) adjust.cell_centre = places;
  const auto& range = needs_.field.range;
  pipeline::CellCorrection cell;
  adjust::Ranks ranks;
  for (std::size_t row = 0; row < split.scored.size(); ++row) {
    const std::size_t i = split.scored[row];
    const double model_height = fold.placed[i].model_height, height = needs_.field.terrain ? elevation[row] : 0;
    const auto& raw = gathered_.series[i];
    const auto model = reduced(raw, steps, lapse, model_height);
    const auto climate = adjust::fit_row(setup, steps, model);
    if (!pipeline::correct_cell(adjust, row, climate, model, cell)) continue;
    adjust::rank_series(setup, steps, climate, model, ranks);
    std::vector<double> made(raw.size());
    adjust::evaluate(setup, steps, model, ranks, cell.correction, cell.run_draws ? &*cell.run_draws : nullptr, made);
    for (std::size_t t = 0; t < raw.size(); ++t) {
      double value = made[t] + lapse[steps.month[t]] * height;
      if (fold.scored[t] == 0 || std::isnan(value)) continue;
      if (range) value = std::clamp(value, range->first, range->second);
      out.raw[i][t] = raw[t];
      out.height[i][t] = raw[t] + lapse[steps.month[t]] * (height - model_height);
      out.adjusted[i][t] = value;
    }
  }
}

ProofSeries ProofMaker::series(const Design& design) const {
  const std::size_t stations = gathered_.placed.size(), steps = gathered_.steps.month.size();
  const std::vector<std::vector<double>> nothing(stations, std::vector<double>(steps, kNone));
  ProofSeries out{nothing, nothing, nothing};
  std::vector<scores::YearSplit> years;
  if (design.years == Design::Years::odd_and_even) years = scores::odd_and_even(this->years());
  if (design.years == Design::Years::halves) years = scores::halves(this->years());
  const auto splits = station_splits(design.stations);
  const auto& setup = gathered_.setup;
  for (std::size_t k = 0; k < std::max<std::size_t>(1, years.size()); ++k) {
    Fold fold;
    fold.placed = gathered_.placed;
    fold.scored.assign(steps, 1);
    if (!years.empty()) {
      for (std::size_t t = 0; t < steps; ++t) {
        fold.scored[t] =
            std::binary_search(years[k].scored.begin(), years[k].scored.end(), gathered_.steps.year[t]) ? 1 : 0;
      }
      for (const Placed& placed : gathered_.placed) {
        fold.records.push_back(station::of_years(*placed.record, years[k].fitted));
      }
      for (std::size_t i = 0; i < stations; ++i) fold.placed[i].record = &fold.records[i];
    }
    if (setup.wet_days() && setup.wet_day > 0) {
      fold.draws = std::make_shared<adjust::Draws>(kDrawSeed, gathered_.steps.date);
    }
    std::exception_ptr failure;
    std::mutex mutex;
    const auto guarded = [&](const auto& work) {
      try {
        if (os::stop_requested()) throw Error(Failure::interrupted, "prove", "interrupted; nothing was written");
        work();
      } catch (...) {
        const std::lock_guard lock(mutex);
        if (!failure) failure = std::current_exception();
      }
    };
    if (!needs_.field.terrain || !needs_.field.terrain->fit) {
      Notices unheard;
      const auto lapse = lapse_of(needs_, gathered_, fold.placed, {}, unheard);
      fold.fitted.resize(stations);
#pragma omp parallel for schedule(dynamic) num_threads(threads_)
      for (std::size_t i = 0; i < stations; ++i) {
        guarded([&] {
          const Placed& placed = fold.placed[i];
          fold.fitted[i] = {placed.record, fit_placed(needs_, gathered_, placed, gathered_.series[i], lapse)};
        });
      }
    }
#pragma omp parallel for schedule(dynamic) num_threads(threads_)
    for (std::size_t s = 0; s < splits.size(); ++s) {
      guarded([&] { make(fold, splits[s], out); });
    }
    if (failure) std::rethrow_exception(failure);
  }
  return out;
}

}  // namespace windrow::engine
