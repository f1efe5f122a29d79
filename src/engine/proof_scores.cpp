#include "proof_scores.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <numeric>

#include "adjust_setup.h"
#include "station_tables.h"
#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
constexpr std::size_t kFirstQuarter = 12;  // of scores::standard_seasons()
constexpr int kReplicates = 1000;
constexpr std::size_t kSmallestGroup = 2;

using Grid = std::vector<std::vector<double>>;  // [station][step]

/// Daily observations on the run's days of like name; days that only one of the calendars has go unscored.
std::vector<double> on_steps(const station::DailySeries& daily, const adjust::Steps& steps) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "stations");
  std::vector<double> out(steps.date.size(), kNone);
  std::size_t t = 0;
  for (std::size_t i = 0; i < daily.day.size(); ++i) {
    const auto date = gregorian.date(daily.day[i]);
    while (t < out.size() && steps.date[t] < date) ++t;
    if (t < out.size() && steps.date[t] == date) out[t] = daily.value[i];
  }
  return out;
}

/// What scores of days are made in: bins and wet days are fixed numbers of K and mm/day.
struct Scale {
  units::Affine affine;
  std::string units;
  scores::Quantity quantity = scores::Quantity::temperature;
};
Scale scale_of(const CalibrationNeeds& needs) {
  const auto& from = needs.output_units;
  if (is_precipitation(needs.conversion.standard_name) && is_rate(from)) {
    return {units::conversion(from, "mm/day", "", "").affine, "mm/day", scores::Quantity::precipitation};
  }
  try {
    return {units::conversion(from, "degC", "", "").affine, "K", scores::Quantity::temperature};
  } catch (const Error&) {
    return {{}, from, scores::Quantity::temperature};
  }
}

/// Units of differences: degC and K differ by nothing there.
std::string difference_units(const std::string& units, const Scale& scale) {
  return scale.units == "K" && scale.affine.scale == 1 ? "K" : units;
}

Grid scaled(const Grid& values, const units::Affine& affine) {
  Grid out = values;
  for (auto& series : out) {
    for (double& x : series) x = affine(x);
  }
  return out;
}

/// What gets intervals by drawing years, which costs a thousand times what a score costs.
struct Judged {
  bool stations, all;  ///< each station's scores; comparisons over all stations
};

class Scorer {
 public:
  Scorer(const CalibrationNeeds& needs, const Gathered& gathered, int threads)
      : needs_(needs),
        gathered_(gathered),
        calendar_(needs.anchor.variable->calendar()),
        scale_(scale_of(needs)),
        threads_(threads) {
    options_.quantity = scale_.quantity;
    for (std::size_t i = 0; gathered.setup.daily && i < gathered.placed.size(); ++i) {
      if (gathered.placed[i].record->daily.day.empty()) continue;
      daily_.push_back(i);
      observed_.push_back(on_steps(gathered.placed[i].record->daily, gathered.steps));
    }
    observed_ = scaled(observed_, scale_.affine);
    if (!daily_.empty()) days_.emplace(calendar_, gathered.steps.date);
  }

  [[nodiscard]] const Scale& scale() const { return scale_; }
  [[nodiscard]] const scores::Options& options() const { return options_; }

  [[nodiscard]] MonthColumn months(const std::string& version, const Grid& series, bool all_years) const {
    MonthColumn out{version, {}, {}};
    for (std::size_t i = 0; i < series.size(); ++i) out.stations.push_back(station_months(i, series[i], all_years));
    out.errors = scores::month_errors(out.stations);
    return out;
  }

  [[nodiscard]] std::vector<SeasonScores> seasons(const ProofSeries& series, const Judged& judged) const;
  [[nodiscard]] PointsAndAreas points(const Grid& product, const std::vector<int>& blocks) const;

 private:
  [[nodiscard]] scores::MonthMeans station_months(std::size_t i, const std::vector<double>& series,
                                                  bool all_years) const;
  [[nodiscard]] SeasonScores season(const scores::Season& season, const ProofSeries& series,
                                    const Judged& judged) const;

  const CalibrationNeeds& needs_;
  const Gathered& gathered_;
  const calendar::Calendar& calendar_;
  Scale scale_;
  int threads_;
  scores::Options options_;
  std::vector<std::size_t> daily_;  ///< placed stations with days
  Grid observed_;                   ///< of those, in the scale's units
  std::optional<scores::Days> days_;
};

/// Of the series the months both have. Calendar months the series lacks are taken from normals, against the run's
/// months within normals_period, or its calibration period where it does not have all twelve: as adjust::fit_station
/// does.
scores::MonthMeans Scorer::station_months(std::size_t i, const std::vector<double>& series, bool all_years) const {
  const auto& record = *gathered_.placed[i].record;
  const auto& steps = gathered_.steps;
  std::vector<scores::MonthOfYear> observed;
  for (const auto& value : record.monthly) observed.push_back({value.year, value.month, value.value});
  auto out = scores::common_means(observed, scores::month_means(calendar_, steps.date, series, gathered_.setup.daily));
  if (record.normal.empty() || !all_years) return out;
  const auto normals = needs_.job.stations.normals_period.value_or(std::pair(0, 0));
  const auto means_where = [&](const auto& taken) {
    std::vector<double> chosen(series);
    for (std::size_t t = 0; t < chosen.size(); ++t) {
      if (!taken(t)) chosen[t] = kNone;
    }
    const auto months = scores::month_means(calendar_, steps.date, chosen, gathered_.setup.daily);
    return scores::common_means(months, months).modelled;
  };
  auto modelled =
      means_where([&](std::size_t t) { return steps.year[t] >= normals.first && steps.year[t] <= normals.second; });
  if (std::any_of(modelled.begin(), modelled.end(), [](double x) { return std::isnan(x); })) {
    modelled = means_where([&](std::size_t t) { return steps.in_period[t] != 0; });
  }
  for (std::size_t m = 0; m < 12; ++m) {
    if (!std::isnan(out.observed[m])) continue;
    out.observed[m] = record.normal[m];
    out.modelled[m] = modelled[m];
  }
  return out;
}

SeasonScores Scorer::season(const scores::Season& season, const ProofSeries& series, const Judged& judged) const {
  SeasonScores out{season, {}, {}};
  std::vector<scores::Versions> versions;
  const scores::Resampling resampling{1, 0, kReplicates};
  for (std::size_t k = 0; k < daily_.size(); ++k) {
    const std::size_t i = daily_[k];
    const auto in_scale = scaled({series.raw[i], series.height[i], series.adjusted[i]}, scale_.affine);
    versions.push_back(
        scores::make_versions(*days_, season, options_, observed_[k], in_scale[0], in_scale[1], in_scale[2]));
    const auto& made = versions.back();
    scores::SeasonScores adjusted{};
    if (judged.stations) {
      adjusted = scores::score_season(made.adjusted, resampling);
    } else {
      const auto values = made.adjusted.scores();
      for (std::size_t s = 0; s < scores::kScores; ++s) adjusted.score[s] = {values[s], {kNone, kNone}};
      adjusted.days = made.adjusted.days();
      adjusted.years = made.adjusted.well_sampled_years();
      adjusted.too_small = adjusted.years < scores::kFewestYears;
    }
    out.stations.push_back({i, made.raw.scores(), made.height.scores(), adjusted});
  }
  if (judged.all) out.comparisons = scores::compare(versions, resampling);
  return out;
}

std::vector<SeasonScores> Scorer::seasons(const ProofSeries& series, const Judged& judged) const {
  if (daily_.empty()) return {};
  const auto standard = scores::standard_seasons();
  std::vector<SeasonScores> out(standard.size() - kFirstQuarter);
#pragma omp parallel for schedule(dynamic) num_threads(threads_)
  for (std::size_t s = 0; s < out.size(); ++s) {
    out[out.size() - 1 - s] = season(standard[standard.size() - 1 - s], series, judged);  // the year takes longest
  }
  return out;
}

PointsAndAreas Scorer::points(const Grid& product, const std::vector<int>& blocks) const {
  PointsAndAreas out;
  if (daily_.size() < 2) return out;
  Grid modelled;
  for (const std::size_t i : daily_) modelled.push_back(product[i]);
  modelled = scaled(modelled, scale_.affine);
  const auto position = [this](std::size_t k) { return gathered_.placed[daily_[k]].record->site.position; };
  const auto distance = [&](std::size_t a, std::size_t b) { return reach::distance_m(position(a), position(b)); };
  std::vector<double> edges{0};
  for (double edge = 25e3; edge < 4e6; edge *= 2) edges.push_back(edge);
  const auto standard = scores::standard_seasons();
  for (std::size_t s = kFirstQuarter; s + 1 < standard.size(); ++s) {
    auto bins = scores::correlation_by_distance(*days_, standard[s], observed_, modelled, distance, edges);
    bins.erase(std::remove_if(bins.begin(), bins.end(), [](const auto& bin) { return bin.pairs == 0; }), bins.end());
    out.likeness.push_back({standard[s], bins});
  }
  if (scale_.quantity != scores::Quantity::precipitation) return out;
  std::map<int, std::vector<std::size_t>> groups;
  for (std::size_t k = 0; k < daily_.size(); ++k) groups[blocks[daily_[k]]].push_back(k);
  std::vector<std::size_t> all(daily_.size());
  std::iota(all.begin(), all.end(), std::size_t{0});
  const auto add = [&](const std::string& name, const std::vector<std::size_t>& group) {
    if (group.size() < kSmallestGroup) return;
    for (std::size_t s = kFirstQuarter; s < standard.size(); ++s) {
      out.areas.emplace_back(name,
                             scores::score_area(*days_, standard[s], observed_, modelled, group, {1, 0, kReplicates}));
    }
  };
  for (const auto& [block, group] : groups) add(fmt::format("block {}", block + 1), group);
  if (groups.size() > 1) add("all stations", all);
  return out;
}

std::vector<Design> designs(const std::vector<int>& years) {
  using Stations = Design::Stations;
  using Years = Design::Years;
  if (years.size() < 2) return {{Stations::one_out, Years::all}, {Stations::blocks_out, Years::all}};
  return {{Stations::one_out, Years::all},
          {Stations::all, Years::odd_and_even},
          {Stations::all, Years::halves},
          {Stations::blocks_out, Years::halves},
          {Stations::blocks_out, Years::odd_and_even}};
}

/// What a place would get from inverse distances alone, and from those after the height adjustment; what the job asks
/// for itself is not repeated.
std::vector<MonthColumn> references(const CalibrationNeeds& needs, const Gathered& gathered, const Scorer& scorer,
                                    int threads) {
  job::JobSpec job = needs.job;
  job::FieldSpec field = needs.field;
  const bool by_distance = job.reach.method == job::ReachMethod::inverse_distance;
  const bool terrain = field.terrain.has_value();
  job.reach.method = job::ReachMethod::inverse_distance;
  CalibrationNeeds other{job,
                         field,
                         needs.target,
                         needs.anchor,
                         needs.anchor_name,
                         needs.conversion,
                         needs.output_units,
                         needs.model_height};
  std::vector<MonthColumn> out;
  const auto add = [&](const std::string& name) {
    const auto series = ProofMaker(other, gathered, threads).series({Design::Stations::one_out, Design::Years::all});
    out.push_back(scorer.months(name, series.adjusted, true));
  };
  if (terrain && !by_distance) add("height, then inverse distance");
  field.terrain.reset();
  if (terrain || !by_distance) add("inverse distance");
  std::reverse(out.begin(), out.end());
  return out;
}

void check_sites(const CalibrationNeeds& needs, const Gathered& gathered) {
  const auto& placed = gathered.placed;
  for (const Placed& other : placed) {
    const auto apart = reach::distance_m(placed.front().record->site.position, other.record->site.position);
    if (apart > scores::kSameSite_m) return;
  }
  const std::string why = placed.size() == 1 ? "no other station can be used"
                                             : fmt::format("all {} stations lie within {:.0f} km of it", placed.size(),
                                                           scores::kSameSite_m / 1000);
  throw Error(
      Failure::data, fmt::format("field '{}', run '{}'", needs.field.name, needs.anchor_name),
      fmt::format("with station '{}' left out nothing is left to fit: {}; expected stations at two sites at least",
                  placed.front().record->site.id, why));
}

}  // namespace

FieldProof prove_field(const CalibrationNeeds& needs, const std::string& family, int threads, Notices& notices,
                       const std::function<void(const std::string&)>& step) {
  const auto gathered = gather(needs, notices);
  check_sites(needs, gathered);
  {
    // What `run` would say of stations and years.
    std::vector<std::size_t> all(gathered.placed.size());
    std::iota(all.begin(), all.end(), std::size_t{0});
    const auto lapse = lapse_of(needs, gathered, gathered.placed, all, notices);
    std::vector<report::StationRecord> outcomes;
    const auto fitted = fit_all(needs, gathered, lapse, outcomes, notices);
    const bool shape = std::any_of(fitted.begin(), fitted.end(), [](const Fitted& f) { return f.fit.shape; });
    if (gathered.setup.width() > 0 && !shape) no_shape(needs);
  }
  const ProofMaker maker(needs, gathered, threads);
  const Scorer scorer(needs, gathered, threads);
  FieldProof out;
  out.field = needs.field.name;
  out.family = family;
  out.run = needs.anchor_name;
  out.units = difference_units(needs.output_units, scorer.scale());
  out.score_units = scorer.scale().units;
  out.options = scorer.options();
  for (const Placed& placed : gathered.placed) out.stations.push_back(placed.record->site.id);
  out.years = maker.years();
  const auto list = designs(out.years);
  out.verdict = list.size() - 1;
  for (std::size_t d = 0; d < list.size(); ++d) {
    step(list[d].name());
    const bool all_years = list[d].years == Design::Years::all;
    const auto series = maker.series(list[d]);
    DesignScores made{list[d], {}, {}};
    made.months.push_back(scorer.months("raw", series.raw, all_years));
    made.months.push_back(scorer.months("height alone", series.height, all_years));
    if (list[d].stations == Design::Stations::one_out) {
      for (auto& column : references(needs, gathered, scorer, threads)) made.months.push_back(std::move(column));
      out.points = scorer.points(series.adjusted, maker.blocks());
    }
    made.months.push_back(scorer.months("adjusted", series.adjusted, all_years));
    made.seasons = scorer.seasons(series, {d == out.verdict, d == 0 || d == out.verdict});
    out.designs.push_back(std::move(made));
  }
  return out;
}

}  // namespace windrow::engine
