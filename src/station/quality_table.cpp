// Checks of one table by itself, whatever its columns: what `inspect` asks for. Knows no job.
#include <fmt/format.h>

#include <algorithm>
#include <unordered_map>

#include "columns.h"
#include "values.h"
#include "windrow/station/quality.h"

namespace windrow::station {
namespace {

/// What units of water begin with; a speed of the wind would convert too.
constexpr const char* kDepths[] = {"mm", "cm", "in", "kg"};

bool is_numeric(const text::CsvTable& table, std::size_t column) {
  bool any = false;
  for (std::size_t row = 0; row < table.rows(); ++row) {
    try {
      any = number_at(table, row, column).has_value() || any;
    } catch (const Error&) {
      return false;
    }
  }
  return any;
}

/// How a column's values are read: as degC, as mm/day, or as they are.
Options options_of(const text::Heading& heading, Mapping& mapping) {
  Options options;
  options.observed = {heading.name};
  const auto converts = [&](const std::string& from, const std::string& to) {
    try {
      units::conversion(from, to, "", "");
      return true;
    } catch (const Error&) {
      return false;
    }
  };
  std::string amount = heading.units;
  const bool rate = !units::per_month(heading.units, &amount) && converts(heading.units, "mm/day");
  const bool named = std::any_of(std::begin(kDepths), std::end(kDepths),
                                 [&](const char* start) { return heading.units.starts_with(start); });
  const bool water = named && (rate || converts(fmt::format("({})/day", amount), "mm/day"));
  if (!heading.units.empty() && converts(heading.units, "K")) {
    options.units = "degC";
  } else if (water) {
    options.units = "mm/day";
    options.kind = Kind::sum;
    options.per_day_rate = true;
  } else {
    options.units = heading.units.empty() ? "1" : heading.units;
    if (heading.units.empty()) mapping.units.emplace(heading.name, "1");
  }
  return options;
}

std::vector<Site> stations_of(const text::CsvTable& table, std::size_t column) {
  std::vector<Site> sites;
  std::unordered_map<std::string, bool> seen;
  for (std::size_t row = 0; row < table.rows(); ++row) {
    std::string id(table.at(row, column));
    if (seen.emplace(id, true).second) {
      Site site;
      site.id = std::move(id);
      sites.push_back(std::move(site));
    }
  }
  return sites;
}

}  // namespace

std::vector<Finding> check_table(const text::CsvTable& table) {
  Notices untold;
  const auto has = [&](const char* name) { return table.column(name) >= 0; };
  if (!has("station")) return {};
  if (has("longitude") && has("latitude")) return check_positions(read_sites(table, {}, untold));
  const bool daily = has("date"), monthly = has("year") && has("month");
  if (!daily && !monthly) return {};
  const auto sites = stations_of(table, need_column(table, {}, "station"));
  std::unordered_map<std::string, std::size_t> station_of;
  for (std::size_t i = 0; i < sites.size(); ++i) station_of.emplace(sites[i].id, i);
  const std::vector tables{table};
  std::vector<ObservedColumn> columns;
  for (std::size_t c = 0; c < table.headings().size(); ++c) {
    const text::Heading& heading = table.headings()[c];
    const bool key = heading.name == "station" || heading.name == "date" || heading.name == "year" ||
                     heading.name == "month" || heading.name.empty();
    if (key || !is_numeric(table, c)) continue;
    Mapping mapping;
    const Options options = options_of(heading, mapping);
    bool found = false;
    std::vector<ObservedColumn> one;
    read_values(tables, daily ? TableKind::daily : TableKind::monthly, station_of, mapping, options, untold, {}, found,
                one);
    columns.insert(columns.end(), one.begin(), one.end());
  }
  return check_columns(sites, columns);
}

}  // namespace windrow::station
