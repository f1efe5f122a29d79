// Every setting of a job as "key = value" texts, in job-file order, each with what it changes. One list serves the
// plan's print-out, the ledger and the staleness key, so that none of them can forget a setting.
#include <fmt/format.h>

#include "sections.h"
#include "windrow/job/spec.h"
#include "windrow/os/files.h"

namespace windrow::job {
namespace {

struct Setting {
  std::string key, value;
  Effect effect;
};

class List {
 public:
  explicit List(const JobSpec& job) : folder_(os::folder_of(job.path)) {}

  void add(const std::string& key, const std::string& value, Effect effect = Effect::result) {
    settings.push_back({key, value, effect});
  }
  void add(const std::string& key, double value, Effect effect = Effect::result) {
    add(key, fmt::format("{}", value), effect);
  }
  void add(const std::string& key, int value, Effect effect = Effect::result) {
    add(key, std::to_string(value), effect);
  }
  void add_path(const std::string& key, const std::string& path, Effect effect = Effect::result) {
    add(key, path.empty() ? "none" : relative(path), effect);
  }
  void add_paths(const std::string& key, const std::vector<std::string>& paths) {
    std::string all;
    for (const std::string& path : paths) all += (all.empty() ? "" : ", ") + relative(path);
    add(key, all.empty() ? "none" : all);
  }

  std::vector<Setting> settings;

 private:
  // Below the job file's folder paths are told relative to it, so that moving the whole folder changes no setting.
  [[nodiscard]] std::string relative(const std::string& path) const {
    const std::string prefix = folder_ == "/" ? folder_ : folder_ + "/";
    return path.starts_with(prefix) ? path.substr(prefix.size()) : path;
  }

  std::string folder_;
};

std::string or_none(const std::string& text) { return text.empty() ? "none" : text; }

std::string joined(const std::vector<std::string>& words) {
  std::string out;
  for (const std::string& word : words) out += (out.empty() ? "" : ", ") + word;
  return out;
}

template <class Map>
std::string joined_pairs(const Map& map) {
  std::string out;
  for (const auto& [name, value] : map) out += fmt::format("{}{} = {}", out.empty() ? "" : ", ", name, value);
  return or_none(out);
}

}  // namespace

std::string word(Adjustment method) {
  switch (method) {
    case Adjustment::none:
      return "none";
    case Adjustment::mean_shift:
      return "mean-shift";
    case Adjustment::mean_ratio:
      return "mean-ratio";
    case Adjustment::variance_scaling:
      return "variance-scaling";
    case Adjustment::quantile_mapping:
      return "quantile-mapping";
    case Adjustment::detrended_quantile_mapping:
      return "detrended-quantile-mapping";
    case Adjustment::quantile_delta_mapping:
      return "quantile-delta-mapping";
    case Adjustment::gamma_mapping:
      return "gamma-mapping";
  }
  return {};
}

namespace {

std::string season_text(const AdjustSpec& adjust) {
  std::string text = adjust.season == SeasonKind::month  ? "month"
                     : adjust.season == SeasonKind::year ? "year"
                                                         : fmt::format("{} days", adjust.window_days);
  if (!adjust.season_given) text += " (daily data), month (monthly data)";
  return text;
}

// What is not given is left to the files; five lines that say so would drown the rest.
void add_grid(List& list, const std::string& prefix, const GridSpec& grid) {
  const bool given = grid.pole || !(grid.crs + grid.axis_units + grid.coordinates + grid.sides).empty();
  if (!given) list.add(prefix + "grid", "as the files say");
  if (!grid.crs.empty()) list.add(prefix + "grid.crs", grid.crs);
  if (grid.pole)
    list.add(prefix + "grid.pole", fmt::format("longitude {}, latitude {}", (*grid.pole)[0], (*grid.pole)[1]));
  if (!grid.axis_units.empty()) list.add(prefix + "grid.units", grid.axis_units);
  if (!grid.coordinates.empty()) list.add_path(prefix + "grid.coordinates", grid.coordinates);
  if (!grid.sides.empty()) list.add(prefix + "grid.sides", grid.sides);
}

void add_run(List& list, const std::string& prefix, const RunSpec& run) {
  list.add(prefix + "name", run.name);
  list.add(prefix + "family", run.family);
  list.add(prefix + "anchor", run.anchor ? "true" : "false");
  list.add(prefix + "forcing", or_none(run.forcing));
  list.add_paths(prefix + "files", run.patterns);
  list.add_path(prefix + "land_fraction", run.land_fraction);
  add_grid(list, prefix, run.grid);
}

void add_adjust(List& list, const std::string& prefix, const AdjustSpec& adjust) {
  list.add(prefix + "method", word(adjust.method));
  if (adjust.method == Adjustment::none) return;
  list.add(prefix + "form", adjust.form == Form::additive ? "additive" : "multiplicative");
  list.add(prefix + "observed", joined(adjust.observed));
  list.add(prefix + "period", adjust.period ? fmt::format("{} to {}", calendar::to_string(adjust.period->first),
                                                          calendar::to_string(adjust.period->second))
                                            : "all of the anchor run");
  list.add(prefix + "season", season_text(adjust));
  if (adjust.season == SeasonKind::moving) list.add(prefix + "day_step", adjust.day_step);
  if (adjust.method >= Adjustment::quantile_mapping) {
    list.add(prefix + "quantiles", adjust.quantiles);
    list.add(prefix + "tails", "constant");
  }
  if (adjust.method == Adjustment::quantile_delta_mapping || adjust.method == Adjustment::detrended_quantile_mapping) {
    list.add(prefix + "window", fmt::format("{} years", adjust.window_years));
    list.add(prefix + "window_step", fmt::format("{} years", adjust.window_step));
  }
  if (adjust.form == Form::multiplicative) {
    list.add(prefix + "wet_day", adjust.wet_day
                                     ? fmt::format("{:.12g} {}", adjust.wet_day->first, adjust.wet_day->second)
                                 : adjust.method == Adjustment::mean_ratio ? "none"
                                                                           : "1 mm/day (precipitation), none (others)");
  }
  if (adjust.form == Form::multiplicative || adjust.method == Adjustment::variance_scaling) {
    list.add(prefix + "max_ratio", adjust.max_ratio);
  }
  list.add(prefix + "carry", adjust.carry == Carry::target ? "target" : "correction");
  list.add(prefix + "period_mismatch", adjust.accept_period_mismatch ? "accept" : "refuse");
}

void add_terrain(List& list, const std::string& prefix, const TerrainSpec& terrain) {
  std::string lapse;
  bool constant = true;
  for (const double value : terrain.lapse_per_m) {
    lapse += fmt::format("{}{:.12g}", lapse.empty() ? "" : ", ", value);
    constant = constant && value == terrain.lapse_per_m[0];
  }
  list.add(prefix + "lapse",
           terrain.fit ? "fit" : (constant ? fmt::format("{:.12g}", terrain.lapse_per_m[0]) : lapse) + " per metre");
  list.add_path(prefix + "model_height", terrain.model_height);
}

std::string method_text(const FieldSpec& field, MeshKind kind) {
  const bool cell_value = kind == MeshKind::towns && field.method == Method::conservative_1;
  return method_word(field.method) + (cell_value ? " (the value of the cell that holds the town)" : "");
}

void add_field(List& list, const std::string& prefix, const FieldSpec& field, MeshKind kind) {
  list.add(prefix + "variable", field.variable);
  list.add(prefix + "name", field.name);
  list.add(prefix + "units", field.units.empty() ? "source" : field.units);
  list.add(prefix + "method", method_text(field, kind));
  list.add(prefix + "quantity", field.total ? "total" : "mean");
  list.add(prefix + "min_cover", field.min_cover);
  list.add(prefix + "min_land", field.min_land);
  list.add(prefix + "fill", field.fill_nearest ? "nearest" : "none");
  list.add(prefix + "range", field.range ? fmt::format("{} to {}", field.range->first, field.range->second) : "none");
  const bool component = field.pair != Pair::none;
  list.add(prefix + "pair", !component ? "none" : field.pair == Pair::eastward ? "eastward" : "northward");
  if (component) list.add(prefix + "axes", field.axes == VectorAxes::mesh ? "mesh" : "east-north");
  add_adjust(list, prefix + "adjust.", field.adjust);
  if (field.terrain) add_terrain(list, prefix + "terrain.", *field.terrain);
}

void add_axis(List& list, const std::string& key, const AxisSpec& axis) {
  list.add(key, fmt::format("{} to {} by {}", axis.from, axis.to, axis.step));
}

void add_mesh(List& list, const MeshSpec& mesh) {
  list.add("mesh.name", mesh.name);
  list.add("mesh.kind", kind_word(mesh.kind));
  switch (mesh.kind) {
    case MeshKind::latlon:
      add_axis(list, "mesh.lon", mesh.x);
      add_axis(list, "mesh.lat", mesh.y);
      break;
    case MeshKind::projected:
      list.add("mesh.crs", mesh.crs);
      add_axis(list, "mesh.x", mesh.x);
      add_axis(list, "mesh.y", mesh.y);
      break;
    case MeshKind::raster:
      list.add_path("mesh.template", mesh.source);
      break;
    case MeshKind::file:
      list.add_path("mesh.from", mesh.source);
      list.add("mesh.variable", mesh.variable.empty() ? "the only one" : mesh.variable);
      break;
    case MeshKind::catchments:
      list.add_path("mesh.polygons", mesh.source);
      list.add("mesh.layer", mesh.layer.empty() ? "the only one" : mesh.layer);
      list.add("mesh.id", mesh.id.empty() ? "numbers from 1" : mesh.id);
      break;
    case MeshKind::towns:
      list.add_path("mesh.sites", mesh.source);
      break;
    case MeshKind::faces:
      list.add_path("mesh.from", mesh.source);
      list.add("mesh.topology", mesh.topology.empty() ? "the only one" : mesh.topology);
      break;
  }
  if (mesh.kind != MeshKind::towns) {
    list.add_path("mesh.height", mesh.height);
    list.add_path("mesh.mask", mesh.mask);
  }
  list.add("mesh.earth", mesh.ellipsoid ? "ellipsoid" : "sphere");
}

void add_stations(List& list, const StationSpec& stations) {
  if (!stations.given) return;
  list.add_path("stations.sites", stations.sites);
  list.add_paths("stations.daily", stations.daily);
  list.add_paths("stations.monthly", stations.monthly);
  list.add_paths("stations.normals", stations.normals);
  list.add("stations.columns", joined_pairs(stations.columns));
  list.add("stations.units", joined_pairs(stations.units));
  list.add("stations.normals_period", stations.normals_period ? fmt::format("{} to {}", stations.normals_period->first,
                                                                            stations.normals_period->second)
                                                              : "not given");
  list.add("stations.min_years", stations.min_years);
  list.add("stations.day", stations.day_note.empty() ? "not given" : stations.day_note);
  list.add("stations.undercatch", or_none(stations.undercatch));
}

void add_reach(List& list, const ReachSpec& reach) {
  const bool nearest = reach.method == ReachMethod::nearest;
  list.add("reach.method", nearest                                         ? "nearest"
                           : reach.method == ReachMethod::inverse_distance ? "inverse-distance"
                           : reach.method == ReachMethod::kriging          ? "kriging"
                                                                           : "kriging-height");
  list.add("reach.radius", fmt::format("{} m", reach.radius_m));
  if (reach.method == ReachMethod::inverse_distance) list.add("reach.power", reach.power);
  if (reach.kriges()) {
    const VariogramSpec& v = reach.variogram;
    const char* model = v.model == VariogramModel::exponential ? "exponential"
                        : v.model == VariogramModel::spherical ? "spherical"
                                                               : "gaussian";
    list.add("reach.variogram",
             v.fit ? fmt::format("fit, {}", model)
                   : fmt::format("{}, nugget {:.12g}, sill {:.12g}, range {} m", model, v.nugget, v.sill, v.range_m));
  }
  list.add("reach.beyond", reach.beyond == Beyond::taper ? "taper" : reach.beyond == Beyond::raw ? "raw" : "missing");
  if (!nearest) list.add("reach.neighbours", reach.neighbours);
}

void add_ensemble(List& list, const JobSpec& job) {
  const EnsembleSpec& ensemble = job.ensemble;
  std::string words, pairs, levels;
  for (const auto& statistic : ensemble.statistics) words += (words.empty() ? "" : ", ") + statistic.word;
  for (const auto& pair : ensemble.contrasts) pairs += (pairs.empty() ? "" : ", ") + contrast_name(job, pair);
  if (!words.empty()) list.add("ensemble.statistics", words);
  if (!pairs.empty()) list.add("ensemble.contrast", pairs);
  if (ensemble.baseline)
    list.add("ensemble.baseline", fmt::format("{} to {}", ensemble.baseline->first, ensemble.baseline->second));
  if (!ensemble.warming) return;
  for (const double level : ensemble.warming->levels) levels += fmt::format("{}{}", levels.empty() ? "" : ", ", level);
  list.add("ensemble.warming.levels", levels);
  if (ensemble.warming->global.empty())
    list.add("ensemble.warming.global", "computed from the run's own files");
  else
    list.add_path("ensemble.warming.global", ensemble.warming->global);
  list.add("ensemble.warming.reference",
           fmt::format("{} to {}", ensemble.warming->reference.first, ensemble.warming->reference.second));
}

void add_job(List& list, const JobSpec& job) {
  list.add("job.title", or_none(job.title));
  list.add_path("job.workspace", job.workspace, Effect::none);
  list.add("job.memory", job.memory_bytes ? fmt::format("{} bytes", *job.memory_bytes) : "80 % of what there is",
           Effect::none);
  list.add("job.threads", job.threads == 0 ? "all processors" : std::to_string(job.threads), Effect::none);
  list.add("job.settle", fmt::format("{} s", job.settle_s), Effect::none);
  list.add("job.version", job.version);
}

std::string tile_text(const std::array<int, 3>& tile, MeshKind kind) {
  const bool rows = is_structured(kind);
  return rows ? fmt::format("{}, {}, {}", tile[0], tile[1], tile[2]) : fmt::format("{}, {}", tile[0], tile[2]);
}

void add_output(List& list, const OutputSpec& output, MeshKind kind) {
  list.add_path("output.directory", output.directory, Effect::none);
  list.add("output.name", output.name, Effect::none);
  list.add("output.calendar", "source");
  list.add("output.compression", output.deflate ? "deflate" : "none", Effect::encoding);
  list.add("output.level", output.level, Effect::encoding);
  list.add("output.digits", output.digits);
  list.add("output.tile", output.tile ? tile_text(*output.tile, kind) : "auto", Effect::encoding);
  // Not of the NetCDF file; but a product is whole only with its other form, so asking for one makes both anew.
  list.add("output.also", output.csv ? "csv" : "none", Effect::encoding);
  for (const auto& [name, value] : output.attributes) list.add("output.attributes." + name, value);
}

std::vector<std::pair<std::string, std::string>> chosen(const List& list, Effect least) {
  std::vector<std::pair<std::string, std::string>> out;
  for (const Setting& setting : list.settings)
    if (setting.effect <= least) out.emplace_back(setting.key, setting.value);
  return out;
}

}  // namespace

std::vector<std::pair<std::string, std::string>> settings(const JobSpec& job, bool result_only) {
  List list(job);
  add_job(list, job);
  for (std::size_t i = 0; i < job.runs.size(); ++i) add_run(list, fmt::format("run.{}.", i), job.runs[i]);
  for (std::size_t i = 0; i < job.fields.size(); ++i)
    add_field(list, fmt::format("field.{}.", i), job.fields[i], job.mesh.kind);
  add_mesh(list, job.mesh);
  add_stations(list, job.stations);
  if (job.stations.given) add_reach(list, job.reach);
  add_ensemble(list, job);
  add_output(list, job.output, job.mesh.kind);
  return chosen(list, result_only ? Effect::result : Effect::none);
}

std::vector<std::pair<std::string, std::string>> product_settings(const JobSpec& job, std::size_t field,
                                                                  std::size_t run, Effect least) {
  List list(job);
  const FieldSpec& made = job.fields.at(field);
  const RunSpec& from = job.runs.at(run);
  add_job(list, job);
  add_run(list, "run.", from);
  const bool adjusted = made.adjust.method != Adjustment::none;
  for (const RunSpec& other : job.runs)
    if (adjusted && other.family == from.family && other.anchor && other.name != from.name)
      add_run(list, "anchor.", other);
  add_field(list, "field.", made, job.mesh.kind);
  // A component is turned together with its partner.
  for (const FieldSpec& other : job.fields)
    if (made.pair != Pair::none && other.pair != Pair::none && other.pair != made.pair)
      list.add("partner.variable", other.variable);
  add_mesh(list, job.mesh);
  if (adjusted) {
    add_stations(list, job.stations);
    add_reach(list, job.reach);
  }
  add_output(list, job.output, job.mesh.kind);
  return chosen(list, least);
}

std::vector<std::pair<std::string, std::string>> ensemble_settings(
    const JobSpec& job, std::size_t field, const std::vector<std::pair<std::string, std::string>>& own, Effect least) {
  List list(job);
  add_job(list, job);
  list.add("field.name", job.fields.at(field).name);
  list.add("mesh.name", job.mesh.name);
  for (const auto& [key, value] : own) list.add(key, value);
  add_output(list, job.output, job.mesh.kind);
  return chosen(list, least);
}

}  // namespace windrow::job
