#include "calibration.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <optional>

#include "adjust_setup.h"
#include "lapse_fit.h"
#include "station_tables.h"
#include "windrow/base/error.h"
#include "windrow/station/station.h"

namespace windrow::engine {
namespace {

/// Impossible values when the job gives no range: outside the records of the WMO archive of weather and climate
/// extremes
/// (-89.2 and 56.7 degC; 1825 mm in 24 h; from memory) with some room.
std::pair<double, double> possible_range(const job::FieldSpec& field, const std::string& units,
                                         const std::string& standard_name) {
  if (field.range) return *field.range;
  const double far = std::numeric_limits<double>::max();
  if (units::is_temperature(units) || standard_name.find("temperature") != std::string::npos) {
    const auto convert = units::conversion("degC", units, "", "").affine;
    return {convert(-95.0), convert(65.0)};
  }
  if (standard_name.find("precipitation") != std::string::npos && is_rate(units)) {
    return {0.0, units::conversion("mm/day", units, "", "").affine(2000.0)};
  }
  return {-far, far};
}

std::vector<station::Record> records(const CalibrationNeeds& needs, Notices& notices) {
  const auto& spec = needs.job.stations;
  const auto files = station_tables(spec, needs.field.adjust.observed, notices);
  station::Options options;
  options.observed = needs.field.adjust.observed;
  options.units = needs.output_units;
  const std::string& name = needs.conversion.standard_name;
  const bool water = is_precipitation(name);
  options.kind = water ? station::Kind::sum : station::Kind::mean;
  options.per_day_rate = water && is_rate(needs.output_units);
  std::tie(options.low, options.high) = possible_range(needs.field, needs.output_units, name);
  options.min_years = spec.min_years;
  options.day_shift = spec.day_shift;
  if (water) options.undercatch = spec.undercatch;
  if (spec.normals_period) std::tie(options.normals_first, options.normals_last) = *spec.normals_period;
  return station::read_records(files, {spec.columns, spec.units}, options, notices);
}

std::vector<Placed> place(const CalibrationNeeds& needs, const std::vector<station::Record>& all, Notices& notices,
                          std::vector<report::StationRecord>& outcomes) {
  std::vector<Placed> out;
  const auto leave_out = [&](const station::Record& record, const std::string& why) {
    notices.add(fmt::format("station {}", record.site.id), fmt::format("left out: {}", why));
    outcomes.push_back({record.site.id, why});
  };
  for (const auto& record : all) {
    if (needs.target.mesh->has_area() && !needs.target.mesh->find(record.site.position)) {
      leave_out(record, "lies outside the mesh");
      continue;
    }
    const auto column = needs.anchor.mesh->find(record.site.position);
    if (!column) {
      leave_out(record, "lies outside the model grid");
      continue;
    }
    Placed placed{&record, static_cast<std::uint32_t>(*column), 0};
    const bool drift = needs.job.reach.method == job::ReachMethod::kriging_height;
    if ((needs.field.terrain || drift) && std::isnan(record.site.elevation_m)) {
      leave_out(record, fmt::format("has no elevation, which {} needs",
                                    needs.field.terrain ? "[field.terrain]" : "kriging-height"));
      continue;
    }
    if (needs.field.terrain) {
      const auto cell = needs.model_height->mesh->find(record.site.position);
      placed.model_height = cell ? needs.model_height->values[*cell] : std::nan("");
      if (std::isnan(placed.model_height)) {
        leave_out(record, "lies where the model height is missing");
        continue;
      }
    }
    out.push_back(placed);
  }
  return out;
}

/// The anchor's series at every placed station, in output units.
std::vector<std::vector<double>> model_series(const CalibrationNeeds& needs, const std::vector<Placed>& placed) {
  std::vector<std::uint32_t> columns;
  columns.reserve(placed.size());
  for (const auto& place : placed) columns.push_back(place.column);
  std::sort(columns.begin(), columns.end());
  columns.erase(std::unique(columns.begin(), columns.end()), columns.end());
  const std::size_t count = needs.anchor.variable->time().size();
  std::vector<double> values(count * columns.size());
  needs.anchor.variable->read(0, count, columns, values.data());
  std::vector<std::vector<double>> out;
  for (const auto& place : placed) {
    const auto at =
        static_cast<std::size_t>(std::lower_bound(columns.begin(), columns.end(), place.column) - columns.begin());
    std::vector<double> series(count);
    for (std::size_t t = 0; t < count; ++t) {
      series[t] = needs.conversion.affine(values[t * columns.size() + at]);
    }
    out.push_back(std::move(series));
  }
  return out;
}

/// A threshold finer than the gauges read would count rounding as rain.
void check_resolution(const adjust::Setup& setup, const std::vector<station::Record>& records,
                      const std::string& place) {
  if (!setup.wet_days() || setup.wet_day <= 0) return;
  for (const auto& record : records) {
    if (!(record.resolution > setup.wet_day * (1 + 1e-6))) continue;
    throw Error(Failure::data, place,
                fmt::format("wet_day is {:.4g}, below the resolution of station {}'s gauge, {:.4g}; expected a "
                            "threshold no finer than the gauges read",
                            setup.wet_day, record.site.id, record.resolution));
  }
}

std::string place_of(const CalibrationNeeds& needs) {
  return fmt::format("field '{}', run '{}'", needs.field.name, needs.anchor_name);
}

[[noreturn]] void no_station(const CalibrationNeeds& needs, const std::vector<report::StationRecord>& outcomes) {
  std::string why =
      outcomes.empty() ? "of those in the tables none can be used; the notes say why" : outcomes.front().outcome;
  for (const auto& outcome : outcomes) {
    if (outcome.outcome != why) {
      why = fmt::format("{}: {}, ...", outcomes.front().id, outcomes.front().outcome);
      break;
    }
  }
  throw Error(Failure::data, fmt::format("field '{}'", needs.field.name),
              fmt::format("no station is left to adjust to ({})", why));
}

void tell_mismatch(const CalibrationNeeds& needs, Notices& notices) {
  const bool accepted = needs.field.adjust.accept_period_mismatch;
  notices.add(fmt::format("field '{}'", needs.field.name),
              fmt::format("the years of some stations do not match those of run '{}': the climate change between them "
                          "becomes part of the correction (period_mismatch = \"{}\")",
                          needs.anchor_name, accepted ? "accept" : "refuse"));
}

}  // namespace

std::vector<calendar::Date> step_dates(const cf::RunVariable& variable) {
  std::vector<calendar::Date> out;
  out.reserve(variable.time().size());
  for (const auto& step : variable.time()) {
    out.push_back(variable.calendar().date_of(step.begin + (step.end - step.begin) / 2));
  }
  return out;
}

std::array<double, 12> lapse_in(const job::TerrainSpec& terrain, const std::string& output_units) {
  double scale = 1;
  if (units::is_temperature(output_units)) scale = units::conversion("K", output_units, "", "").affine.scale;
  std::array<double, 12> out{};
  for (std::size_t m = 0; m < 12; ++m) out[m] = terrain.lapse_per_m[m] * scale;
  return out;
}

void no_shape(const CalibrationNeeds& needs) {
  throw Error(Failure::data, place_of(needs),
              job::word(needs.field.adjust.method) + " needs stations with daily series; there are none");
}

Gathered gather(const CalibrationNeeds& needs, Notices& notices) {
  const std::string place_text = place_of(needs);
  Gathered out;
  out.setup =
      adjust_setup(needs.field.adjust, *needs.anchor.variable, needs.conversion, needs.output_units, place_text);
  out.steps = adjust::make_steps(out.setup, needs.anchor.variable->calendar(), step_dates(*needs.anchor.variable),
                                 needs.field.adjust.period, true, place_text);
  out.records = records(needs, notices);
  check_resolution(out.setup, out.records, place_text);
  out.placed = place(needs, out.records, notices, out.left_out);
  if (out.placed.empty()) no_station(needs, out.left_out);
  out.series = model_series(needs, out.placed);
  return out;
}

std::array<double, 12> lapse_of(const CalibrationNeeds& needs, const Gathered& gathered,
                                const std::vector<Placed>& placed, const std::vector<std::size_t>& chosen,
                                Notices& notices) {
  if (!needs.field.terrain) return {};
  if (!needs.field.terrain->fit) return lapse_in(*needs.field.terrain, needs.output_units);
  std::vector<Placed> stations;
  std::vector<std::vector<double>> series;
  for (const std::size_t i : chosen) {
    stations.push_back(placed[i]);
    series.push_back(gathered.series[i]);
  }
  return fit_lapse(stations, series, gathered.steps, place_of(needs), notices);
}

std::vector<double> reduced(const std::vector<double>& series, const adjust::Steps& steps,
                            const std::array<double, 12>& lapse, double height_m) {
  std::vector<double> out(series);
  for (std::size_t t = 0; t < out.size(); ++t) out[t] -= lapse[steps.month[t]] * height_m;
  return out;
}

adjust::StationFit fit_placed(const CalibrationNeeds& needs, const Gathered& gathered, const Placed& placed,
                              const std::vector<double>& series, const std::array<double, 12>& lapse) {
  const auto& record = *placed.record;
  std::vector<double> reduction(12, 0.0);
  for (std::size_t m = 0; m < 12 && needs.field.terrain; ++m) reduction[m] = lapse[m] * record.site.elevation_m;
  const auto model = needs.field.terrain ? reduced(series, gathered.steps, lapse, placed.model_height) : series;
  return adjust::fit_station(gathered.setup, gathered.steps, model, record, reduction,
                             needs.job.stations.normals_period.value_or(std::pair(0, 0)),
                             needs.field.adjust.accept_period_mismatch);
}

std::vector<Fitted> fit_all(const CalibrationNeeds& needs, const Gathered& gathered,
                            const std::array<double, 12>& lapse, std::vector<report::StationRecord>& outcomes,
                            Notices& notices) {
  std::vector<Fitted> out;
  for (std::size_t i = 0; i < gathered.placed.size(); ++i) {
    const auto& record = *gathered.placed[i].record;
    auto fit = fit_placed(needs, gathered, gathered.placed[i], gathered.series[i], lapse);
    outcomes.push_back({record.site.id, !fit.level ? fit.left_out : fit.shape ? "level and shape" : "level"});
    if (fit.level) {
      out.push_back({&record, std::move(fit)});
    } else {
      notices.add(fmt::format("station {}", record.site.id), fmt::format("left out: {}", fit.left_out));
    }
  }
  if (out.empty()) no_station(needs, outcomes);
  return out;
}

Calibration calibrate(const CalibrationNeeds& needs, Notices& notices) {
  auto gathered = gather(needs, notices);
  Calibration out;
  out.stations = gathered.left_out;
  std::vector<std::size_t> all(gathered.placed.size());
  std::iota(all.begin(), all.end(), std::size_t{0});
  out.lapse = lapse_of(needs, gathered, gathered.placed, all, notices);
  const auto fitted = fit_all(needs, gathered, out.lapse, out.stations, notices);
  for (const auto& f : fitted) out.period_mismatch = out.period_mismatch || f.fit.period_mismatch;
  std::vector<const Fitted*> chosen;
  for (const auto& f : fitted) chosen.push_back(&f);
  std::vector<GeoPoint> cells;
  for (std::size_t i = 0; i < needs.target.mesh->size(); ++i) cells.push_back(needs.target.mesh->centre(i));
  out.carried = carry_over(needs.job, needs.field, gathered.setup, chosen, cells, notices);
  if (gathered.setup.width() > 0 && out.carried.shape_stations == 0) {
    no_shape(needs);
  }
  if (out.period_mismatch) tell_mismatch(needs, notices);
  out.setup = std::move(gathered.setup);
  out.steps = std::move(gathered.steps);
  return out;
}

}  // namespace windrow::engine
