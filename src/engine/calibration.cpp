#include "calibration.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <optional>

#include "station_tables.h"
#include "windrow/base/error.h"
#include "windrow/station/station.h"

namespace windrow::engine {
namespace {

bool is_rate(const std::string& units) {
  for (const char* rate : {"m s-1", "kg m-2 s-1"}) {
    try {
      // A speed is a rate in units too, but no water: callers ask for fields whose stations give sums.
      units::conversion(units, rate, "", "");
      return true;
    } catch (const Error&) {
      continue;
    }
  }
  return false;
}

/// Impossible values when the job gives no range: outside the records of the WMO archive of weather and climate extremes
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

/// A record with its place in the model.
struct Placed {
  const station::Record* record;
  std::uint32_t column = 0;
  double model_height = 0;
};

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
    if (needs.field.terrain) {
      if (std::isnan(record.site.elevation_m)) {
        leave_out(record, "has no elevation, which [field.terrain] needs");
        continue;
      }
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

/// The anchor's reduced series at every placed station.
std::vector<std::vector<double>> model_series(const CalibrationNeeds& needs, const std::vector<Placed>& placed,
                                              const adjust::Steps& steps, const std::array<double, 12>& lapse) {
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
    const auto at = static_cast<std::size_t>(std::lower_bound(columns.begin(), columns.end(), place.column) -
                                             columns.begin());
    std::vector<double> series(count);
    for (std::size_t t = 0; t < count; ++t) {
      series[t] = needs.conversion.affine(values[t * columns.size() + at]) - lapse[steps.month[t]] * place.model_height;
    }
    out.push_back(std::move(series));
  }
  return out;
}

void add_to(std::vector<double>& sum, const std::vector<double>& values) {
  if (sum.empty()) sum.assign(values.size(), 0.0);
  for (std::size_t i = 0; i < values.size(); ++i) sum[i] += values[i];
}

void divide(std::vector<double>& sum, std::size_t count) {
  for (double& x : sum) x /= static_cast<double>(count);
}

struct Fitted {
  GeoPoint position;
  adjust::StationFit fit;
};

reach::ReachMap reach_of(const CalibrationNeeds& needs, const std::vector<GeoPoint>& stations) {
  const auto& spec = needs.job.reach;
  std::vector<GeoPoint> cells;
  cells.reserve(needs.target.mesh->size());
  for (std::size_t i = 0; i < needs.target.mesh->size(); ++i) cells.push_back(needs.target.mesh->centre(i));
  reach::Options options;
  options.method = spec.method == job::ReachMethod::nearest ? reach::Method::nearest : reach::Method::inverse_distance;
  options.radius_m = spec.radius_m;
  options.power = spec.power;
  options.neighbours = spec.neighbours;
  return reach::make_reach(stations, cells, options);
}

/// Targets (or corrections) of all stations in a row, their means, and the reach maps.
void carry_over(const CalibrationNeeds& needs, const std::vector<Fitted>& fitted, Calibration& out) {
  std::vector<GeoPoint> level, shape;
  const bool target = needs.field.adjust.carry == job::Carry::target;
  for (const auto& [position, fit] : fitted) {
    level.push_back(position);
    const auto& values = target ? fit.target_level : fit.correction_level;
    out.station_level.insert(out.station_level.end(), values.begin(), values.end());
    add_to(out.mean_correction_level, fit.correction_level);
    if (!fit.shape) continue;
    shape.push_back(position);
    const auto& shapes = target ? fit.target_shape : fit.correction_shape;
    out.station_shape.insert(out.station_shape.end(), shapes.begin(), shapes.end());
    add_to(out.mean_correction_shape, fit.correction_shape);
  }
  out.level_stations = level.size();
  out.shape_stations = shape.size();
  divide(out.mean_correction_level, level.size());
  if (!shape.empty()) divide(out.mean_correction_shape, shape.size());
  if (needs.job.reach.beyond == job::Beyond::raw) {
    std::fill(out.mean_correction_level.begin(), out.mean_correction_level.end(), 0.0);
    std::fill(out.mean_correction_shape.begin(), out.mean_correction_shape.end(), 0.0);
  }
  out.level = reach_of(needs, level);
  if (out.setup.method == adjust::Method::quantile_mapping) out.shape = reach_of(needs, shape);
}

[[noreturn]] void no_station(const CalibrationNeeds& needs, const std::vector<report::StationRecord>& outcomes) {
  std::string why = outcomes.empty() ? "of those in the tables none can be used; the notes say why" : outcomes.front().outcome;
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

adjust::Setup adjust_setup(const job::AdjustSpec& spec, const cf::RunVariable& variable, const std::string& place) {
  adjust::Setup out;
  const auto frequency = variable.frequency();
  if (frequency != cf::Frequency::daily && frequency != cf::Frequency::monthly) {
    throw Error(Failure::data, place, "adjustment needs daily or monthly means; this variable has neither");
  }
  out.daily = frequency == cf::Frequency::daily;
  out.method = spec.method == job::Adjustment::mean_shift   ? adjust::Method::mean_shift
               : spec.method == job::Adjustment::mean_ratio ? adjust::Method::mean_ratio
                                                            : adjust::Method::quantile_mapping;
  if (!out.daily && spec.season_given && spec.season != job::SeasonKind::month) {
    throw Error(Failure::data, place, "monthly values need season = \"month\"");
  }
  out.seasons = !out.daily || spec.season == job::SeasonKind::month ? calendar::Seasons::by_month()
                : spec.season == job::SeasonKind::year              ? calendar::Seasons::by_year()
                                                      : calendar::Seasons::moving(spec.window_days, spec.day_step);
  out.quantiles = spec.quantiles;
  out.max_ratio = spec.max_ratio;
  out.carry_target = spec.carry == job::Carry::target;
  return out;
}

std::array<double, 12> lapse_in(const job::TerrainSpec& terrain, const std::string& output_units) {
  double scale = 1;
  if (units::is_temperature(output_units)) scale = units::conversion("K", output_units, "", "").affine.scale;
  std::array<double, 12> out{};
  for (std::size_t m = 0; m < 12; ++m) out[m] = terrain.lapse_per_m[m] * scale;
  return out;
}

Calibration calibrate(const CalibrationNeeds& needs, Notices& notices) {
  const std::string place_text = fmt::format("field '{}', run '{}'", needs.field.name, needs.anchor_name);
  Calibration out;
  out.setup = adjust_setup(needs.field.adjust, *needs.anchor.variable, place_text);
  out.steps = adjust::make_steps(out.setup, needs.anchor.variable->calendar(), step_dates(*needs.anchor.variable),
                                 needs.field.adjust.period, true, place_text);
  if (needs.field.terrain) out.lapse = lapse_in(*needs.field.terrain, needs.output_units);
  const auto all = records(needs, notices);
  const auto placed = place(needs, all, notices, out.stations);
  if (placed.empty()) no_station(needs, out.stations);
  const auto series = model_series(needs, placed, out.steps, out.lapse);
  std::vector<Fitted> fitted;
  for (std::size_t i = 0; i < placed.size(); ++i) {
    const auto& record = *placed[i].record;
    std::vector<double> reduction(12, 0.0);
    for (std::size_t m = 0; m < 12 && needs.field.terrain; ++m) reduction[m] = out.lapse[m] * record.site.elevation_m;
    auto fit = adjust::fit_station(out.setup, out.steps, series[i], record, reduction,
                                   needs.job.stations.normals_period.value_or(std::pair(0, 0)),
                                   needs.field.adjust.accept_period_mismatch);
    const bool used = fit.level;
    out.stations.push_back({record.site.id, !used ? fit.left_out : fit.shape ? "level and shape" : "level"});
    if (!used) {
      notices.add(fmt::format("station {}", record.site.id), fmt::format("left out: {}", fit.left_out));
      continue;
    }
    out.period_mismatch = out.period_mismatch || fit.period_mismatch;
    fitted.push_back({record.site.position, std::move(fit)});
  }
  if (fitted.empty()) no_station(needs, out.stations);
  carry_over(needs, fitted, out);
  if (out.setup.method == adjust::Method::quantile_mapping && out.shape_stations == 0) {
    throw Error(Failure::data, place_text, "quantile-mapping needs stations with daily series; there are none");
  }
  if (out.period_mismatch) tell_mismatch(needs, notices);
  return out;
}

}  // namespace windrow::engine
