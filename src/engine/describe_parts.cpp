#include "describe_parts.h"

#include "windrow/calendar/time_units.h"
#include "windrow/pipeline/tile_stats.h"

namespace windrow::engine {
namespace {

using cf::SmallVariable;
using cf::Type;

// CF 7.1: no default reference; one that every tool knows and that keeps days of model calendars whole.
constexpr const char* kTimeUnits = "days since 1850-01-01 00:00:00";

SmallVariable variable(const std::string& name, Type type, std::vector<std::string> dimensions,
                       std::vector<double> values, std::vector<cf::NamedValue> attributes, bool deflate = false) {
  return {name, type, std::move(dimensions), std::move(attributes), std::move(values), deflate};
}

std::vector<cf::NamedValue> time_attributes(const calendar::Calendar& calendar, const std::string& cells,
                                            const std::string& bounds) {
  return {{"standard_name", "time"},        {"long_name", "time"}, {"axis", "T"}, {"units", kTimeUnits},
          {"calendar", calendar.cf_name()}, {cells, bounds}};
}

}  // namespace

std::vector<SmallVariable> time_axis(const calendar::Calendar& calendar, std::span<const cf::TimeStep> steps) {
  const auto units = calendar::TimeUnits::parse(kTimeUnits, calendar, "time");
  std::vector<double> time, bounds;
  for (const auto& step : steps) {
    time.push_back(units.encode(step.time));
    bounds.insert(bounds.end(), {units.encode(step.begin), units.encode(step.end)});
  }
  return {variable("time", Type::float64, {"time"}, std::move(time), time_attributes(calendar, "bounds", "time_bnds")),
          variable("time_bnds", Type::float64, {"time", "bnds"}, std::move(bounds), {})};
}

std::vector<SmallVariable> climatology_axis(const calendar::Calendar& calendar, const std::string& name, int centre,
                                            int first, int last) {
  const auto units = calendar::TimeUnits::parse(kTimeUnits, calendar, name);
  const auto start = [&](int year, int month) {
    return month == 13 ? calendar.instant({year + 1, 1, 1}) : calendar.instant({year, month, 1});
  };
  std::vector<double> time, bounds;
  for (int month = 1; month <= 12; ++month) {
    const auto begin = start(centre, month), end = start(centre, month + 1);
    time.push_back(units.encode(begin + (end - begin) / 2));
    bounds.insert(bounds.end(), {units.encode(start(first, month)), units.encode(start(last, month + 1))});
  }
  const std::string cells = "climatology_bnds";
  return {variable(name, Type::float64, {name}, std::move(time), time_attributes(calendar, "climatology", cells)),
          variable(cells, Type::float64, {name, "bnds"}, std::move(bounds), {})};
}

SmallVariable status_flag(std::span<const std::uint8_t> flags, const std::vector<std::string>& horizontal,
                          const std::string& long_name) {
  return variable(
      "status_flag", Type::int8, horizontal, {flags.begin(), flags.end()},
      {{"standard_name", "status_flag"},
       {"long_name", long_name},
       {"flag_masks", std::vector<std::int8_t>{pipeline::kAdjusted, pipeline::kFilled, pipeline::kTooLittleCover,
                                               pipeline::kTooLittleLand, pipeline::kBeyondReach, pipeline::kAllSurface,
                                               pipeline::kBeyondRange}},
       {"flag_meanings",
        "adjusted_to_stations filled_from_nearest_source_cell too_little_cover_at_some_time "
        "too_little_land beyond_reach_of_stations all_surface_value_without_land "
        "some_values_beyond_calibrated_range"},
       {"units", "1"}},
      true);
}

/// What the source says about itself and still holds for the product. Left out: identifiers and dates of the source
/// file.
const std::set<std::string>& kept_globals() {
  static const std::set<std::string> kNames = {"institution",
                                               "institute_id",
                                               "institution_id",
                                               "model_id",
                                               "source_id",
                                               "experiment",
                                               "experiment_id",
                                               "forcing",
                                               "realization",
                                               "initialization_method",
                                               "physics_version",
                                               "variant_label",
                                               "activity_id",
                                               "parent_experiment",
                                               "parent_experiment_id",
                                               "parent_experiment_rip",
                                               "branch_time",
                                               "project_id",
                                               "frequency",
                                               "modeling_realm",
                                               "realm",
                                               "references",
                                               "license",
                                               "driving_model_id",
                                               "driving_experiment"};
  return kNames;
}

void set(std::vector<cf::NamedValue>& list, const std::string& name, cf::AttributeValue value) {
  for (auto& entry : list) {
    if (entry.name == name) {
      entry.value = std::move(value);
      return;
    }
  }
  list.push_back({name, std::move(value)});
}

}  // namespace windrow::engine
