// The CF description of a product: dimensions, coordinates, bounds, attributes (CF Conventions 1.13).
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "assemble.h"
#include "windrow/calendar/time_units.h"
#include "windrow/linear_map/kernel.h"

namespace windrow::engine {
namespace {

using cf::NamedValue;
using cf::SmallVariable;
using cf::Type;

// CF 7.1: no default reference; one that every tool knows and that keeps days of model calendars whole.
constexpr const char* kTimeUnits = "days since 1850-01-01 00:00:00";

class Describer {
 public:
  Describer(const StageContext& context, const Product& product, const pipeline::TileStats& stats)
      : context_(context), product_(product), stats_(stats), target_(context.target) {}

  cf::ProductFile describe(const report::Balance& balance);

 private:
  [[nodiscard]] bool fixed() const { return context_.source.variable->frequency() == cf::Frequency::fixed; }
  [[nodiscard]] std::vector<std::string> horizontal() const {
    return target_.projected ? std::vector<std::string>{"y", "x"} : std::vector<std::string>{"lat", "lon"};
  }
  void add(const std::string& name, Type type, std::vector<std::string> dimensions, std::vector<double> values,
           std::vector<NamedValue> attributes, bool deflate = false) {
    file_.small.push_back({name, type, std::move(dimensions), std::move(attributes), std::move(values), deflate});
  }
  void add_axis(const std::string& name, const std::vector<double>& edges, std::vector<NamedValue> attributes);
  void add_time();
  void add_positions();
  void add_grid_mapping();
  void add_cell_area();
  void add_height();
  void add_cover();
  void add_status();
  void add_quantization();
  void add_data();
  std::vector<NamedValue> data_attributes();
  void add_globals(const report::Balance& balance);
  [[nodiscard]] std::string comment() const;

  const StageContext& context_;
  const Product& product_;
  const pipeline::TileStats& stats_;
  const Target& target_;
  cf::ProductFile file_;
};

void Describer::add_axis(const std::string& name, const std::vector<double>& edges,
                         std::vector<NamedValue> attributes) {
  std::vector<double> centres, bounds;
  for (std::size_t i = 0; i + 1 < edges.size(); ++i) {
    centres.push_back((edges[i] + edges[i + 1]) / 2);
    bounds.insert(bounds.end(), {edges[i], edges[i + 1]});
  }
  attributes.push_back({"bounds", name + "_bnds"});
  add(name, Type::float64, {name}, std::move(centres), std::move(attributes));
  add(name + "_bnds", Type::float64, {name, "bnds"}, std::move(bounds), {});
}

void Describer::add_time() {
  const auto& variable = *context_.source.variable;
  const auto units = calendar::TimeUnits::parse(kTimeUnits, variable.calendar(), "time");
  std::vector<double> time, bounds;
  for (std::size_t t = product_.span.t0; t < product_.span.t1; ++t) {
    const auto& step = variable.time()[t];
    time.push_back(units.encode(step.time));
    bounds.insert(bounds.end(), {units.encode(step.begin), units.encode(step.end)});
  }
  add("time", Type::float64, {"time"}, std::move(time),
      {{"standard_name", "time"}, {"long_name", "time"}, {"axis", "T"}, {"units", kTimeUnits},
       {"calendar", variable.calendar().cf_name()}, {"bounds", "time_bnds"}});
  add("time_bnds", Type::float64, {"time", "bnds"}, std::move(bounds), {});
}

void Describer::add_positions() {
  const std::vector<NamedValue> lat{{"standard_name", "latitude"}, {"long_name", "latitude"}, {"units", "degrees_north"}};
  const std::vector<NamedValue> lon{{"standard_name", "longitude"}, {"long_name", "longitude"}, {"units", "degrees_east"}};
  const auto with_axis = [](std::vector<NamedValue> attributes, const char* axis) {
    attributes.push_back({"axis", axis});
    return attributes;
  };
  if (!target_.projected) {
    add_axis("lat", target_.y_edges, with_axis(lat, "Y"));
    add_axis("lon", target_.x_edges, with_axis(lon, "X"));
    return;
  }
  const std::string units = target_.crs.units.empty() ? "m" : target_.crs.units;
  add_axis("y", target_.y_edges, {{"standard_name", "projection_y_coordinate"}, {"long_name", "y of projection"},
                                  {"units", units}, {"axis", "Y"}});
  add_axis("x", target_.x_edges, {{"standard_name", "projection_x_coordinate"}, {"long_name", "x of projection"},
                                  {"units", units}, {"axis", "X"}});
  // Geodetic positions of the cell centres, straight from the projection.
  std::vector<double> longitude, latitude;
  for (std::size_t y = 0; y < target_.ny; ++y) {
    for (std::size_t x = 0; x < target_.nx; ++x) {
      longitude.push_back((target_.x_edges[x] + target_.x_edges[x + 1]) / 2);
      latitude.push_back((target_.y_edges[y] + target_.y_edges[y + 1]) / 2);
    }
  }
  target_.crs.to_geographic(longitude, latitude);
  add("lat", Type::float64, {"y", "x"}, std::move(latitude), lat, true);
  add("lon", Type::float64, {"y", "x"}, std::move(longitude), lon, true);
}

void Describer::add_grid_mapping() {
  std::vector<NamedValue> attributes;
  const std::string& mapping = target_.crs.grid_mapping.name;
  if (!mapping.empty()) attributes.push_back({"grid_mapping_name", mapping});
  for (const auto& [name, value] : target_.crs.grid_mapping.attributes) {
    std::visit([&, &key = name](const auto& given) { attributes.push_back({key, given}); }, value);
  }
  attributes.push_back({"crs_wkt", target_.crs.wkt});
  add("crs", Type::int32, {}, {0}, std::move(attributes));
}

void Describer::add_cell_area() {
  std::vector<double> area(target_.mesh->size());
  const double scale = target_.earth.radius_m * target_.earth.radius_m;
  for (std::size_t i = 0; i < area.size(); ++i) area[i] = target_.mesh->area(i) * scale;
  add("cell_area", Type::float64, horizontal(), std::move(area),
      {{"standard_name", "cell_area"}, {"long_name", "area of the mesh cell"}, {"units", "m2"}}, true);
}

void Describer::add_height() {
  if (context_.input.adjust == nullptr || !context_.input.adjust->terrain) return;
  std::vector<double> height = context_.input.adjust->cell_height;
  const auto missing = static_cast<double>(context_.input.field.missing);
  for (double& x : height) x = std::isnan(x) ? missing : x;
  add("height", Type::float32, horizontal(), std::move(height),
      {{"_FillValue", context_.input.field.missing},
       {"standard_name", "surface_altitude"},
       {"long_name", "mean height of the mesh cell, to which values were brought"},
       {"units", "m"},
       {"grid_mapping", "crs"}}, true);
}

std::vector<NamedValue> cover_attributes() {
  return {{"long_name", "share of the cell's area covered by source cells that have a value"},
          {"units", "1"},
          {"comment", "0: no source; below the job's min_cover a cell is missing or filled"}};
}

void Describer::add_cover() {
  const auto cover = cover_under(context_.weights, context_.scan, context_.scan.mask_of_step[product_.span.t0]);
  add("cover", Type::float32, horizontal(), {cover.begin(), cover.end()}, cover_attributes(), true);
}

void Describer::add_status() {
  std::vector<double> flags(stats_.flags.begin(), stats_.flags.end());
  add("status_flag", Type::int8, horizontal(), std::move(flags),
      {{"standard_name", "status_flag"},
       {"long_name", "how the cell's values came about, over all times of this file"},
       {"flag_masks", std::vector<std::int8_t>{pipeline::kAdjusted, pipeline::kFilled, pipeline::kTooLittleCover,
                                               pipeline::kTooLittleLand, pipeline::kBeyondReach, pipeline::kAllSurface,
                                               pipeline::kBeyondRange}},
       {"flag_meanings", "adjusted_to_stations filled_from_nearest_source_cell too_little_cover_at_some_time "
                         "too_little_land beyond_reach_of_stations all_surface_value_without_land "
                         "some_values_beyond_calibrated_range"},
       {"units", "1"}}, true);
}

void Describer::add_quantization() {
  if (context_.input.field.keep_bits == 0) return;
  add("quantization_info", Type::int32, {}, {0},
      {{"algorithm", "bitround"}, {"implementation", "windrow version " WINDROW_VERSION}});
}

std::string Describer::comment() const {
  const auto& job = context_.session.job;
  std::string text;
  if (context_.calibration != nullptr) {
    const auto& observed = job.fields[context_.field].adjust.observed;
    if (observed.size() == 2) {
      text += fmt::format("Adjusted to the mean of {} and {}, which is no 24-hour mean. ", observed[0], observed[1]);
    }
    if (!job.stations.day_note.empty()) text += job.stations.day_note + ". ";
    if (context_.calibration->period_mismatch) {
      text += "The years of stations and model do not match: the climate change between them is part of the "
              "correction. ";
    }
  }
  if (!context_.conversion.note.empty()) text += context_.conversion.note + ". ";
  if (!text.empty()) text.pop_back();
  return text;
}

std::string cell_methods_of(const std::string& source, bool total) {
  if (source.find("area:") != std::string::npos) return source;
  const std::string area = total ? "area: sum" : "area: mean";
  return source.empty() ? area : source + " " + area;
}

std::vector<NamedValue> Describer::data_attributes() {
  const auto& info = context_.source.variable->info();
  std::vector<NamedValue> out;
  if (!context_.conversion.standard_name.empty()) out.push_back({"standard_name", context_.conversion.standard_name});
  const auto& name = context_.session.job.fields[context_.field].name;
  out.push_back({"long_name", info.long_name.empty() ? name : info.long_name});
  out.push_back({"units", context_.output_units});
  if (context_.conversion.standard_name.find("temperature") != std::string::npos) {
    out.push_back({"units_metadata", "temperature: on_scale"});
  }
  out.push_back({"cell_methods", cell_methods_of(info.cell_methods, context_.session.job.fields[context_.field].total)});
  out.push_back({"grid_mapping", "crs"});
  if (target_.projected) out.push_back({"coordinates", "lat lon"});
  out.push_back({"cell_measures", "area: cell_area"});
  out.push_back({"ancillary_variables", "status_flag cover"});
  if (const int bits = context_.input.field.keep_bits; bits > 0) {
    out.push_back({"quantization", "quantization_info"});
    out.push_back({"quantization_nsb", static_cast<std::int32_t>(bits)});
  }
  if (stats_.minimum <= stats_.maximum) {
    out.push_back({"actual_minimum", stats_.minimum});
    out.push_back({"actual_maximum", stats_.maximum});
  }
  if (const auto text = comment(); !text.empty()) out.push_back({"comment", text});
  return out;
}

void Describer::add_data() {
  std::vector<std::string> dimensions = horizontal();
  std::vector<std::size_t> chunk{context_.input.chunk.y, context_.input.chunk.x};
  if (!fixed()) {
    dimensions.insert(dimensions.begin(), "time");
    chunk.insert(chunk.begin(), context_.input.chunk.time);
  }
  const auto& name = context_.session.job.fields[context_.field].name;
  const float missing = context_.input.field.missing;
  file_.chunked.push_back({name, dimensions, chunk, context_.input.level, missing, data_attributes()});
  const auto index = static_cast<std::size_t>(&product_ - context_.products.data());
  if (context_.input.products[index].cover_varies) {
    auto attributes = cover_attributes();
    attributes.push_back({"grid_mapping", "crs"});
    if (target_.projected) attributes.push_back({"coordinates", "lat lon"});
    file_.chunked.push_back({"cover", dimensions, chunk, context_.input.level, missing, std::move(attributes)});
  } else {
    add_cover();
  }
}

/// What the source says about itself and still holds for the product. Left out: identifiers and dates of the source file.
const std::set<std::string>& kept_globals() {
  static const std::set<std::string> kNames = {
      "institution", "institute_id", "institution_id", "model_id", "source_id", "experiment", "experiment_id",
      "forcing", "realization", "initialization_method", "physics_version", "variant_label", "activity_id",
      "parent_experiment", "parent_experiment_id", "parent_experiment_rip", "branch_time", "project_id", "frequency",
      "modeling_realm", "realm", "references", "license", "driving_model_id", "driving_experiment"};
  return kNames;
}

void set(std::vector<NamedValue>& list, const std::string& name, cf::AttributeValue value) {
  for (auto& entry : list) {
    if (entry.name == name) {
      entry.value = std::move(value);
      return;
    }
  }
  list.push_back({name, std::move(value)});
}

void Describer::add_globals(const report::Balance& balance) {
  const auto& job = context_.session.job;
  const auto& run = job.runs[context_.run];
  auto& out = file_.global;
  set(out, "Conventions", "CF-1.13");
  set(out, "title", job.title.empty() ? fmt::format("{} of {} on {}", job.fields[context_.field].name, run.name,
                                                    job.mesh.name) : job.title);
  std::string source_history, source_source;
  for (const auto& attribute : context_.source.variable->info().global_attributes) {
    if (attribute.name == "history") source_history = attribute.text;
    if (attribute.name == "source") source_source = attribute.text;
    if (!kept_globals().contains(attribute.name)) continue;
    if (!attribute.text.empty()) {
      set(out, attribute.name, attribute.text);
    } else if (attribute.numbers.size() == 1) {
      set(out, attribute.name, attribute.numbers[0]);
    }
  }
  const bool adjusted = context_.calibration != nullptr;
  set(out, "source", fmt::format("{}{}", source_source.empty() ? "model output" : source_source,
                                 adjusted ? ", regridded conservatively and adjusted to stations"
                                          : ", regridded conservatively"));
  set(out, "history", fmt::format("{}{} windrow {}: {}", source_history.empty() ? "" : source_history + "\n",
                                  newest_input_date(product_), WINDROW_VERSION,
                                  adjusted ? "regridding (conservative-1), adjustment" : "regridding (conservative-1)"));
  set(out, "run", run.name);
  set(out, "family", run.family);
  if (!run.forcing.empty()) set(out, "run_forcing", run.forcing);
  set(out, "product_version", job.version);
  set(out, "windrow_version", WINDROW_VERSION);
  set(out, "windrow_linear_map", context_.weights.map->provenance);
  set(out, "windrow_balance_source", balance.all.source);
  set(out, "windrow_balance_product", balance.all.product);
  set(out, "windrow_balance_below_min_cover", balance.all.below);
  set(out, "windrow_balance_largest_relative_residual", balance.all.relative);
  if (adjusted) {
    const auto& spec = job.fields[context_.field].adjust;
    const char* method = context_.calibration->setup.method == adjust::Method::mean_shift   ? "mean-shift"
                         : context_.calibration->setup.method == adjust::Method::mean_ratio ? "mean-ratio"
                                                                                            : "quantile-mapping";
    set(out, "windrow_adjustment", fmt::format("{}, calibrated on run {}, {} stations{}", method,
                                               job.runs[context_.session.anchor_of(context_.run)].name,
                                               context_.calibration->level_stations,
                                               spec.accept_period_mismatch && context_.calibration->period_mismatch
                                                   ? ", period mismatch accepted"
                                                   : ""));
  }
  std::string cautions;
  for (const auto& text : report::cautions()) cautions += (cautions.empty() ? "" : " ") + text;
  set(out, "cautions", cautions);
  for (const auto& [name, value] : job.output.attributes) set(out, name, value);
}

cf::ProductFile Describer::describe(const report::Balance& balance) {
  if (!fixed()) {
    file_.dimensions.push_back({"time", product_.span.t1 - product_.span.t0, true});
  }
  const auto names = horizontal();
  file_.dimensions.push_back({names[0], target_.ny, false});
  file_.dimensions.push_back({names[1], target_.nx, false});
  file_.dimensions.push_back({"bnds", 2, false});
  if (!fixed()) add_time();
  add_positions();
  add_grid_mapping();
  add_cell_area();
  add_height();
  add_status();
  add_quantization();
  add_data();
  add_globals(balance);
  return std::move(file_);
}

}  // namespace

cf::ProductFile describe(const StageContext& context, const Product& product, const pipeline::TileStats& stats,
                         const report::Balance& balance) {
  return Describer(context, product, stats).describe(balance);
}

}  // namespace windrow::engine
