// The CF description of a product: dimensions, coordinates, bounds, attributes (CF Conventions 1.13).
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <span>

#include "assemble.h"
#include "describe_mesh.h"
#include "describe_parts.h"
#include "station_tables.h"
#include "windrow/linear_map/kernel.h"

namespace windrow::engine {
namespace {

using cf::NamedValue;
using cf::SmallVariable;
using cf::Type;

class Describer {
 public:
  Describer(const StageContext& context, const Product& product, const pipeline::TileStats& stats)
      : context_(context),
        product_(product),
        stats_(stats),
        target_(context.target),
        mesh_(describe_mesh(context.target)) {}

  cf::ProductFile describe(const report::Balance& balance);

 private:
  [[nodiscard]] bool fixed() const { return context_.source.variable->frequency() == cf::Frequency::fixed; }
  [[nodiscard]] const std::vector<std::string>& horizontal() const { return mesh_.horizontal; }
  void add(const std::string& name, Type type, std::vector<std::string> dimensions, std::vector<double> values,
           std::vector<NamedValue> attributes, bool deflate = false) {
    file_.small.push_back({name, type, std::move(dimensions), std::move(attributes), std::move(values), deflate});
  }
  void add_time();
  void add_height();
  void add_cover();
  void add_status();
  void add_quantization();
  void add_data();
  std::vector<NamedValue> data_attributes();
  void add_globals(const report::Balance& balance);
  [[nodiscard]] std::string comment() const;
  [[nodiscard]] std::string method_words() const;
  [[nodiscard]] std::string area_method() const;
  [[nodiscard]] std::string standard_name() const;

  const StageContext& context_;
  const Product& product_;
  const pipeline::TileStats& stats_;
  const Target& target_;
  MeshDescription mesh_;
  cf::ProductFile file_;
};

void Describer::add_time() {
  const auto& variable = *context_.source.variable;
  const std::span steps(variable.time());
  for (auto& part :
       time_axis(variable.calendar(), steps.subspan(product_.span.t0, product_.span.t1 - product_.span.t0)))
    file_.small.push_back(std::move(part));
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
       {"grid_mapping", "crs"}},
      true);
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
  file_.small.push_back(
      status_flag(stats_.flags, horizontal(), "how the cell's values came about, over all times of this file"));
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
    if (is_precipitation(context_.conversion.standard_name)) {
      text += job.stations.undercatch.empty()
                  ? "Station values are not corrected for undercatch. "
                  : fmt::format("Station values are multiplied by the undercatch factors of column '{}'. ",
                                job.stations.undercatch);
    }
    if (context_.calibration->period_mismatch) {
      text +=
          "The years of stations and model do not match: the climate change between them is part of the "
          "correction. ";
    }
  }
  if (!context_.conversion.note.empty()) text += context_.conversion.note + ". ";
  if (!text.empty()) text.pop_back();
  return text;
}

std::string Describer::method_words() const {
  const auto method = context_.session.job.fields[context_.field].method;
  const bool sampled = method == job::Method::bilinear || method == job::Method::nearest;
  return target_.mesh->has_area() || sampled ? name_of(method) : "value of the cell that contains the town";
}

/// What a value stands for on the mesh: a mean or sum over the cell, its commonest category, or the value at its
/// centre.
std::string cell_methods_of(const std::string& source, const std::string& area) {
  if (source.find("area:") != std::string::npos) return source;
  return source.empty() ? area : source + " " + area;
}

/// A vector's component is named after the axis it runs along now.
std::string Describer::standard_name() const {
  const auto& field = context_.session.job.fields[context_.field];
  std::string name = context_.conversion.standard_name;
  if (field.pair == job::Pair::none) return name;
  const bool first = field.pair == job::Pair::eastward;
  const std::string wanted =
      field.axes == job::VectorAxes::mesh ? (first ? "x_" : "y_") : (first ? "eastward_" : "northward_");
  for (const char* old : {"grid_eastward_", "grid_northward_", "eastward_", "northward_", "x_", "y_"}) {
    const auto at = name.find(old);
    if (at != 0 && (at == std::string::npos || name[at - 1] != '_')) continue;
    return name.replace(at, std::string(old).size(), wanted);
  }
  return name;
}

std::string Describer::area_method() const {
  const auto& field = context_.session.job.fields[context_.field];
  const bool sampled = field.method == job::Method::bilinear || field.method == job::Method::nearest;
  if (sampled || !target_.mesh->has_area()) return "area: point";
  if (field.method == job::Method::majority) return "area: mode";
  return field.total ? "area: sum" : "area: mean";
}

std::vector<NamedValue> Describer::data_attributes() {
  const auto& info = context_.source.variable->info();
  std::vector<NamedValue> out;
  if (const auto standard = standard_name(); !standard.empty()) out.push_back({"standard_name", standard});
  const auto& name = context_.session.job.fields[context_.field].name;
  out.push_back({"long_name", info.long_name.empty() ? name : info.long_name});
  out.push_back({"units", context_.output_units});
  if (context_.conversion.standard_name.find("temperature") != std::string::npos) {
    out.push_back({"units_metadata", "temperature: on_scale"});
  }
  out.push_back({"cell_methods", cell_methods_of(info.cell_methods, area_method())});
  out.insert(out.end(), mesh_.data_attributes.begin(), mesh_.data_attributes.end());
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
  if (dimensions.size() == 1) chunk.erase(chunk.begin());
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
    attributes.insert(attributes.end(), mesh_.data_attributes.begin(), mesh_.data_attributes.end());
    file_.chunked.push_back({"cover", dimensions, chunk, context_.input.level, missing, std::move(attributes)});
  } else {
    add_cover();
  }
}

void Describer::add_globals(const report::Balance& balance) {
  const auto& job = context_.session.job;
  const auto& run = job.runs[context_.run];
  auto& out = file_.global;
  set(out, "Conventions", mesh_.conventions);
  for (const auto& [name, value] : mesh_.global) set(out, name, value);
  set(out, "title",
      job.title.empty() ? fmt::format("{} of {} on {}", job.fields[context_.field].name, run.name, job.mesh.name)
                        : job.title);
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
  const std::string method = method_words();
  set(out, "source",
      fmt::format("{}, {}{}", source_source.empty() ? "model output" : source_source,
                  context_.regridding.keeps_integrals ? "regridded conservatively" : "regridded by " + method,
                  adjusted ? " and adjusted to stations" : ""));
  set(out, "history",
      fmt::format("{}{} windrow {}: {}", source_history.empty() ? "" : source_history + "\n",
                  newest_input_date(product_), WINDROW_VERSION,
                  fmt::format("regridding ({}){}", method, adjusted ? ", adjustment" : "")));
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
    const std::string transfer = job::word(spec.method);
    set(out, "windrow_adjustment",
        fmt::format(
            "{}, calibrated on run {}, {} stations{}", transfer,
            job.runs[context_.session.anchor_of(context_.run)].name, context_.calibration->carried.level_stations,
            spec.accept_period_mismatch && context_.calibration->period_mismatch ? ", period mismatch accepted" : ""));
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
  file_.dimensions.insert(file_.dimensions.end(), mesh_.dimensions.begin(), mesh_.dimensions.end());
  if (!fixed()) add_time();
  file_.small.insert(file_.small.end(), mesh_.variables.begin(), mesh_.variables.end());
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
