// The CF description of products of [ensemble] (CF Conventions 1.13: 7.3 cell methods, 7.4 climatologies, 7.5
// anomalies).
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <span>

#include "describe_mesh.h"
#include "describe_parts.h"
#include "ensemble_make.h"
#include "windrow/base/error.h"
#include "windrow/report/ledger.h"
#include "windrow/units/units.h"

namespace windrow::engine {
namespace {

using cf::NamedValue;

std::string text_of(const std::vector<cf::Attribute>& list, const std::string& name) {
  for (const auto& attribute : list) {
    if (attribute.name == name) return attribute.text;
  }
  return {};
}

std::string joined(const std::string& a, const std::string& b) { return a.empty() || b.empty() ? a + b : a + " " + b; }

/// What a cell method says about the horizontal ("area: mean"), and about time ("time: mean").
std::string part_of(const std::string& methods, const std::string& dimension) {
  const auto at = methods.find(dimension + ":");
  if (at == std::string::npos) return {};
  auto end = methods.find(": ", at + dimension.size() + 1);
  // The next entry begins with the word before its colon.
  end = end == std::string::npos ? methods.size() : methods.rfind(' ', end);
  std::string part = methods.substr(at, end - at);
  while (!part.empty() && part.back() == ' ') part.pop_back();
  return part;
}

std::string over_years(const std::string& dimension, const MemberText& member) {
  return joined(fmt::format("{0}: mean within years {0}: mean over years", dimension),
                part_of(member.cell_methods, "area"));
}

std::string years_text(const ensemble::Years& years) { return fmt::format("{}-{}", years.first, years.last); }

/// Climatologies are means of steps that may be no means themselves.
std::string averaged_comment(const MemberText& member) {
  const std::string time = part_of(member.cell_methods, "time");
  return time.empty() || time == "time: mean" ? "" : fmt::format("what is averaged has the cell method '{}'", time);
}

std::string member_names(const EnsembleStage& stage) {
  std::string out;
  for (const auto& series : stage.members) out += (out.empty() ? "" : ", ") + series->name;
  return out;
}

std::string climatology_name(const MemberText& member) { return member.variable + "_climatology"; }

/// Differences of temperatures are in kelvin and not on the scale (CF 3.1.2).
void make_difference(OutputText& out, const MemberText& member) {
  if (!member.temperature) return;
  out.units_metadata = "temperature: difference";
  if (!units::is_temperature(member.units)) return;
  out.scale = units::conversion(member.units, "K", "", member.variable).affine.scale;
  out.units = "K";
}

void tell_statistic(OutputText& out, const MemberText& member, const job::EnsembleStatistic& statistic) {
  out.variable += "_" + job::statistic_part(statistic);
  const std::string of = fmt::format(" of {}", member.long_name);
  switch (statistic.kind) {
    case job::StatisticKind::mean:
      out.long_name = "ensemble mean" + of;
      out.cell_methods = joined(out.cell_methods, "realization: mean");
      return;
    case job::StatisticKind::spread:
      out.long_name = "ensemble spread (standard deviation with n - 1)" + of;
      out.cell_methods = joined(out.cell_methods, "realization: standard_deviation");
      make_difference(out, member);
      return;
    case job::StatisticKind::quantile:
      // CF has no cell method for a quantile, so that the name alone would mislead.
      out.standard_name.clear();
      out.long_name = fmt::format("ensemble quantile {}{}", statistic.p, of);
      out.comment = "quantile of type 7 of Hyndman & Fan 1996 over the members";
      return;
    case job::StatisticKind::agreement:
      out.standard_name.clear();
      out.units = "1";
      out.units_metadata.clear();
      out.long_name = "share of ensemble members whose change has the sign of the ensemble mean change," + of;
      out.comment = "changes are those of each member against its own baseline";
      return;
  }
}

class EnsembleDescriber {
 public:
  EnsembleDescriber(Session& session, const EnsembleStage& stage, std::size_t product, const MemberText& member,
                    const EnsembleFacts& facts)
      : session_(session),
        stage_(stage),
        product_(stage.result.products[product]),
        member_(member),
        facts_(facts),
        text_(output_text(stage, member, stage.output_of[product])),
        mesh_(describe_mesh(session.target())) {}

  cf::ProductFile describe(const std::string& date) {
    file_.dimensions.push_back({"time", product_.span.t1 - product_.span.t0, true});
    file_.dimensions.insert(file_.dimensions.end(), mesh_.dimensions.begin(), mesh_.dimensions.end());
    add_time();
    file_.small.insert(file_.small.end(), mesh_.variables.begin(), mesh_.variables.end());
    file_.small.push_back(status_flag(facts_.flags, mesh_.horizontal,
                                      "how the values of the members came about, over all members and their times"));
    add_data();
    if (stage_.kind == EnsembleKind::anomaly) add_climatology();
    add_globals(date);
    return std::move(file_);
  }

 private:
  void add_time();
  void add_data();
  void add_climatology();
  void add_globals(const std::string& date);
  void add_chunked(const std::string& name, const std::string& time, std::size_t time_chunk,
                   std::vector<NamedValue> attributes);

  Session& session_;
  const EnsembleStage& stage_;
  const Product& product_;
  const MemberText& member_;
  const EnsembleFacts& facts_;
  OutputText text_;
  MeshDescription mesh_;
  cf::ProductFile file_;
};

void EnsembleDescriber::add_time() {
  const auto& axis = stage_.result;
  if (stage_.kind == EnsembleKind::warming) {
    file_.small = climatology_axis(axis.calendar, "time", stage_.centre, stage_.period.first, stage_.period.last);
    return;
  }
  const std::span steps(axis.time);
  file_.small = time_axis(axis.calendar, steps.subspan(product_.span.t0, product_.span.t1 - product_.span.t0));
}

void EnsembleDescriber::add_chunked(const std::string& name, const std::string& time, std::size_t time_chunk,
                                    std::vector<NamedValue> attributes) {
  std::vector<std::string> dimensions{time};
  dimensions.insert(dimensions.end(), mesh_.horizontal.begin(), mesh_.horizontal.end());
  std::vector<std::size_t> chunk{time_chunk, facts_.chunk.y, facts_.chunk.x};
  if (dimensions.size() == 2) chunk = {time_chunk, facts_.chunk.x};
  file_.chunked.push_back({name, dimensions, chunk, facts_.level, member_.missing, std::move(attributes)});
}

void EnsembleDescriber::add_data() {
  std::vector<NamedValue> out;
  if (!text_.standard_name.empty()) out.push_back({"standard_name", text_.standard_name});
  out.push_back({"long_name", text_.long_name});
  out.push_back({"units", text_.units});
  if (!text_.units_metadata.empty()) out.push_back({"units_metadata", text_.units_metadata});
  out.push_back({"cell_methods", text_.cell_methods});
  out.insert(out.end(), mesh_.data_attributes.begin(), mesh_.data_attributes.end());
  const bool anomaly = stage_.kind == EnsembleKind::anomaly;
  out.push_back({"ancillary_variables", anomaly ? "status_flag " + climatology_name(member_) : "status_flag"});
  if (facts_.minimum <= facts_.maximum) {
    out.push_back({"actual_minimum", facts_.minimum});
    out.push_back({"actual_maximum", facts_.maximum});
  }
  if (!text_.comment.empty()) out.push_back({"comment", text_.comment});
  add_chunked(text_.variable, "time", facts_.chunk.time, std::move(out));
}

void EnsembleDescriber::add_climatology() {
  const std::string axis = "climatology_time";
  const auto& years = stage_.period;
  file_.dimensions.push_back({axis, 12, false});
  for (auto& part :
       climatology_axis(stage_.result.calendar, axis, (years.first + years.last) / 2, years.first, years.last)) {
    file_.small.push_back(std::move(part));
  }
  std::vector<NamedValue> out;
  if (!member_.standard_name.empty()) out.push_back({"standard_name", member_.standard_name});
  out.push_back({"long_name", fmt::format("{}, monthly mean of {}", member_.long_name, years_text(years))});
  out.push_back({"units", member_.units});
  if (!member_.units_metadata.empty()) out.push_back({"units_metadata", member_.units_metadata});
  out.push_back({"cell_methods", over_years(axis, member_)});
  out.insert(out.end(), mesh_.data_attributes.begin(), mesh_.data_attributes.end());
  if (const auto text = averaged_comment(member_); !text.empty()) out.push_back({"comment", text});
  add_chunked(climatology_name(member_), axis, 12, std::move(out));
}

void EnsembleDescriber::add_globals(const std::string& date) {
  const auto& job = session_.job;
  auto& out = file_.global;
  static constexpr std::array<const char*, 4> kWords = {"contrast", "anomaly", "statistics", "warming level"};
  const std::string names = member_names(stage_);
  set(out, "Conventions", mesh_.conventions);
  for (const auto& [name, value] : mesh_.global) set(out, name, value);
  set(out, "title", job.title.empty() ? fmt::format("{} on {}", text_.long_name, job.mesh.name) : job.title);
  for (const auto& attribute : member_.global) {
    if (!attribute.text.empty()) {
      set(out, attribute.name, attribute.text);
    } else if (attribute.numbers.size() == 1) {
      set(out, attribute.name, attribute.numbers[0]);
    }
  }
  set(out, "source", fmt::format("computed from finished products of {}", names));
  set(out, "history", fmt::format("{} windrow {}: {}", date, WINDROW_VERSION, stage_.name));
  set(out, "windrow_ensemble", std::string(kWords[static_cast<std::size_t>(stage_.kind)]));
  set(out, "windrow_members", names);
  if (!stage_.forcing.empty()) set(out, "run_forcing", stage_.forcing);
  if (stage_.kind == EnsembleKind::anomaly) set(out, "windrow_baseline", years_text(stage_.period));
  if (stage_.kind == EnsembleKind::warming) {
    set(out, "windrow_warming_level", fmt::format("{} K", stage_.level));
    set(out, "windrow_warming_central_year", static_cast<std::int32_t>(stage_.centre));
    set(out, "windrow_warming_years", years_text(stage_.period));
    const auto& reference = job.ensemble.warming->reference;
    set(out, "windrow_warming_reference", years_text({reference.first, reference.second}));
  }
  set(out, "product_version", job.version);
  set(out, "windrow_version", WINDROW_VERSION);
  std::string cautions;
  for (const auto& text : report::cautions()) cautions = joined(cautions, text);
  set(out, "cautions", cautions);
  for (const auto& [name, value] : job.output.attributes) set(out, name, value);
}

}  // namespace

MemberText member_text(const EnsembleStage& stage) {
  MemberText out;
  for (const auto& series : stage.members) {
    const auto& path = series->products.front().path;
    const auto reader = cf::open_product(path);
    std::string name;
    for (const auto& variable : reader->variables()) {
      if (!text_of(reader->attributes(variable), "ancillary_variables").empty()) name = variable;
    }
    const auto attributes = reader->attributes(name);
    const std::string units = text_of(attributes, "units");
    if (series == stage.members.front()) {
      out.variable = name;
      out.standard_name = text_of(attributes, "standard_name");
      out.long_name = text_of(attributes, "long_name");
      out.units = units;
      out.units_metadata = text_of(attributes, "units_metadata");
      out.cell_methods = text_of(attributes, "cell_methods");
      out.temperature = out.units_metadata.starts_with("temperature:") || units::is_temperature(units);
      for (const auto& attribute : attributes) {
        if (attribute.name == "_FillValue" && !attribute.numbers.empty()) {
          out.missing = static_cast<float>(attribute.numbers[0]);
        }
      }
      for (const auto& attribute : reader->global_attributes()) {
        if (kept_globals().contains(attribute.name)) out.global.push_back(attribute);
      }
      continue;
    }
    if (units != out.units) {
      throw Error(Failure::data, stage.name,
                  fmt::format("'{}' has units {}, '{}' {}; expected 'units' in [[field]]", stage.members.front()->name,
                              out.units, series->name, units));
    }
    const auto global = reader->global_attributes();
    std::erase_if(out.global, [&](const cf::Attribute& mine) {
      return std::none_of(global.begin(), global.end(), [&](const cf::Attribute& theirs) {
        return theirs.name == mine.name && theirs.text == mine.text && theirs.numbers == mine.numbers;
      });
    });
  }
  return out;
}

OutputText output_text(const EnsembleStage& stage, const MemberText& member, std::size_t output) {
  OutputText out;
  out.variable = member.variable;
  out.standard_name = member.standard_name;
  out.long_name = member.long_name;
  out.units = member.units;
  out.units_metadata = member.units_metadata;
  out.cell_methods = member.cell_methods;
  switch (stage.kind) {
    case EnsembleKind::contrast:
      // No standard name means a difference between two runs.
      out.standard_name.clear();
      out.long_name = fmt::format("{}, {} minus {}", member.long_name, stage.members[0]->name, stage.members[1]->name);
      make_difference(out, member);
      return out;
    case EnsembleKind::anomaly:
      out.long_name =
          fmt::format("{}, anomaly from the monthly means of {}", member.long_name, years_text(stage.period));
      out.cell_methods = joined(member.cell_methods, "time: anomaly_wrt " + climatology_name(member));
      make_difference(out, member);
      return out;
    case EnsembleKind::statistics:
      if (stage.of_anomalies) {
        // The climatologies they are anomalies from stand in the members' products only.
        out.standard_name.clear();
        out.cell_methods = member.cell_methods.substr(0, member.cell_methods.find(" time: anomaly_wrt"));
      }
      tell_statistic(out, member, stage.statistics[output]);
      return out;
    case EnsembleKind::warming:
      out.long_name = fmt::format("{}, monthly mean of the years {} about {} K of global warming", member.long_name,
                                  years_text(stage.period), stage.level);
      out.cell_methods = over_years("time", member);
      out.comment = averaged_comment(member);
      return out;
  }
  return out;
}

cf::ProductFile describe_ensemble(Session& session, const EnsembleStage& stage, std::size_t product,
                                  const MemberText& member, const EnsembleFacts& facts, const std::string& date) {
  return EnsembleDescriber(session, stage, product, member, facts).describe(date);
}

}  // namespace windrow::engine
