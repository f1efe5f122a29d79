// Columns of station tables: which is meant, and how its text becomes a value in output units.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/station/station.h"
#include "windrow/text/csv.h"
#include "windrow/units/units.h"

namespace windrow::station {

enum class Span { day, month };

/// Column of windrow's name `name`, through the mapping or by itself; nullopt when the table has neither.
std::optional<std::size_t> find_column(const text::CsvTable& table, const Mapping& mapping, const std::string& name);
/// The same; Error(data) with the near miss when there is none.
std::size_t need_column(const text::CsvTable& table, const Mapping& mapping, const std::string& name);
Error no_column(const text::CsvTable& table, const Mapping& mapping, const std::string& name);

std::string place_of(const text::CsvTable& table, std::size_t row);
/// nullopt where missing (empty, NA, NaN); Error(data) when it is no finite number.
std::optional<double> number_at(const text::CsvTable& table, std::size_t row, std::size_t column);
/// A whole number within [low, high]; Error(data) otherwise.
int whole_at(const text::CsvTable& table, std::size_t row, std::size_t column, int low, int high);

/// Units of a column: of its bracket, or of the mapping; empty when there are none.
std::string units_of(const text::CsvTable& table, std::size_t column, const Mapping& mapping);

/// How the numbers of one observed column become values.
struct ValueColumn {
  std::size_t column = 0;
  units::Affine affine;
  bool by_length = false;  // an amount over the span: divide by its length in days first
  [[nodiscard]] double value(double number, double days) const { return affine(by_length ? number / days : number); }
};
ValueColumn value_column(const text::CsvTable& table, std::size_t column, const Mapping& mapping,
                         const Options& options, Span span);

}  // namespace windrow::station
