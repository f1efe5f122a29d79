// Finding columns and units; numbers from cells.
#include "columns.h"

#include <fmt/format.h>

#include <cmath>

#include "windrow/text/words.h"

namespace windrow::station {
namespace {

bool is_missing(std::string_view text) {
  if (text.empty()) return true;
  if (text.size() > 3) return false;
  const std::string word = text::lower(text);
  return word == "na" || word == "nan";
}

std::string per_day(const std::string& units) { return fmt::format("({})/day", units); }

}  // namespace

std::optional<std::size_t> find_column(const text::CsvTable& table, const Mapping& mapping, const std::string& name) {
  const auto mapped = mapping.columns.find(name);
  int column = mapped == mapping.columns.end() ? -1 : table.column(mapped->second);
  if (column < 0) column = table.column(name);
  if (column < 0) return std::nullopt;
  return static_cast<std::size_t>(column);
}

Error no_column(const text::CsvTable& table, const Mapping& mapping, const std::string& name) {
  const auto mapped = mapping.columns.find(name);
  const std::string wanted = mapped == mapping.columns.end() ? name : mapped->second;
  std::vector<std::string> names;
  for (const text::Heading& h : table.headings()) names.push_back(h.name);
  const std::string near = text::nearest_word(wanted, names);
  const std::string help = near.empty() ? fmt::format("set columns = {{ {} = \"...\" }} in [stations]; it has {}", name,
                                                      fmt::join(names, ", "))
                                        : fmt::format("did you mean '{}'?", near);
  return {Failure::data, table.file(), fmt::format("no column '{}'; {}", wanted, help)};
}

std::size_t need_column(const text::CsvTable& table, const Mapping& mapping, const std::string& name) {
  const auto column = find_column(table, mapping, name);
  if (!column) throw no_column(table, mapping, name);
  return *column;
}

std::string place_of(const text::CsvTable& table, std::size_t row) { return table.place(row); }

std::optional<double> number_at(const text::CsvTable& table, std::size_t row, std::size_t column) {
  const std::string_view text = table.at(row, column);
  if (is_missing(text)) return std::nullopt;
  const auto number = text::parse_number(text);
  if (!number || !std::isfinite(*number)) {
    throw Error(Failure::data, place_of(table, row),
                fmt::format("column '{}': '{}' is not a number; a missing value is left empty, NA or NaN",
                            table.headings()[column].name, text));
  }
  return number;
}

int whole_at(const text::CsvTable& table, std::size_t row, std::size_t column, int low, int high) {
  const auto number = number_at(table, row, column);
  if (!number || *number < low || *number > high || std::floor(*number) != *number) {
    throw Error(Failure::data, place_of(table, row),
                fmt::format("column '{}': '{}'; expected a whole number from {} to {}", table.headings()[column].name,
                            table.at(row, column), low, high));
  }
  return static_cast<int>(*number);
}

std::string units_of(const text::CsvTable& table, std::size_t column, const Mapping& mapping) {
  const text::Heading& heading = table.headings()[column];
  if (!heading.units.empty()) return heading.units;
  const auto given = mapping.units.find(heading.name);
  return given == mapping.units.end() ? std::string() : given->second;
}

ValueColumn value_column(const text::CsvTable& table, std::size_t column, const Mapping& mapping,
                         const Options& options, Span span) {
  const std::string& name = table.headings()[column].name;
  const std::string place = fmt::format("{}: column '{}'", table.file(), name);
  const std::string units = units_of(table, column, mapping);
  if (units.empty()) {
    throw Error(Failure::data, place,
                fmt::format("no units; expected a heading '{} [{}]' or units = {{ {} = \"{}\" }} in [stations]", name,
                            options.units, name, options.units));
  }
  std::string amount, wanted_amount;
  const bool per_month = units::per_month(units, &amount);
  const bool to_per_month = units::per_month(options.units, &wanted_amount);
  if (per_month && span == Span::day) {
    throw Error(Failure::data, place,
                fmt::format("units '{}' in a table of days; expected an amount or a rate", units));
  }
  const auto affine = [&](const std::string& from, const std::string& to) {
    return units::conversion(from, to, "", place).affine;
  };
  if (to_per_month) return {column, affine(per_month ? amount : units, wanted_amount), false};
  if (per_month) return {column, affine(per_day(amount), options.units), true};
  try {
    return {column, affine(units, options.units), false};
  } catch (const Error&) {
    // An amount (mm) against a rate (mm/day): over the day, or over the month.
    if (!options.per_day_rate || !units::known(per_day(units))) throw;
    try {
      return {column, affine(per_day(units), options.units), true};
    } catch (const Error&) {
    }
    throw;
  }
}

}  // namespace windrow::station
