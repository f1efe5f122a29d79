// Reading dated values: conversion, impossible values, duplicates.
#include "values.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "columns.h"
#include "details.h"

namespace windrow::station {
namespace {

struct Row {
  Value value;
  std::uint32_t table = 0;
  std::uint32_t row = 0;
};

/// Dates of one table's rows and the length of the span they stand for.
class Dates {
 public:
  Dates(const text::CsvTable& table, TableKind kind, const Mapping& mapping, const Options& options)
      : table_(table), kind_(kind), gregorian_(calendar::Calendar::from_cf("proleptic_gregorian", table.file())) {
    if (kind == TableKind::daily) {
      first_ = need_column(table, mapping, "date");
    } else {
      month_ = need_column(table, mapping, "month");
      if (kind == TableKind::monthly) first_ = need_column(table, mapping, "year");
    }
    const bool given = options.normals_last >= options.normals_first && options.normals_last != 0;
    const int from = given ? options.normals_first : 1, to = given ? options.normals_last : 400;
    for (int month = 1; month <= 12; ++month) {
      double days = 0;
      for (int year = from; year <= to; ++year) days += gregorian_.days_in_month(year, month);
      mean_length_.push_back(days / (to - from + 1));
    }
  }

  /// Date of the row; `days`: length of its span.
  std::int64_t date(std::size_t row, double& days) const {
    if (kind_ == TableKind::daily) {
      const calendar::Date date = calendar::parse_date(std::string(table_.at(row, first_)), place_of(table_, row));
      if (!gregorian_.valid(date)) {
        throw Error(Failure::data, place_of(table_, row),
                    fmt::format("'{}' is no day of the calendar", table_.at(row, first_)));
      }
      days = 1;
      return gregorian_.day_number(date);
    }
    const int month = whole_at(table_, row, month_, 1, 12);
    if (kind_ == TableKind::normals) {
      days = mean_length_[static_cast<std::size_t>(month - 1)];
      return month - 1;
    }
    const int year = whole_at(table_, row, first_, 1, 9999);
    days = gregorian_.days_in_month(year, month);
    return year * 12LL + month - 1;
  }

  static std::string text(TableKind kind, std::int64_t date) {
    if (kind == TableKind::daily) {
      return calendar::to_string(calendar::Calendar::from_cf("proleptic_gregorian", "").date(date));
    }
    if (kind == TableKind::normals) return fmt::format("month {}", date + 1);
    return fmt::format("{:04}-{:02}", date / 12, date % 12 + 1);
  }

 private:
  const text::CsvTable& table_;
  TableKind kind_;
  calendar::Calendar gregorian_;
  std::size_t first_ = 0, month_ = 0;
  std::vector<double> mean_length_;
};

class Reader {
 public:
  Reader(const std::vector<text::CsvTable>& tables, TableKind kind,
         const std::unordered_map<std::string, std::size_t>& station_of, const Mapping& mapping, const Options& options,
         Notices& notices)
      : tables_(tables),
        kind_(kind),
        station_of_(station_of),
        mapping_(mapping),
        options_(options),
        notices_(notices),
        rows_(station_of.size()) {}

  bool read() {
    bool found = false;
    for (std::size_t t = 0; t < tables_.size(); ++t) found = read_table(t) || found;
    return found;
  }

  std::vector<std::vector<Value>> values() {
    std::vector<std::string> ids(rows_.size());
    for (const auto& [id, i] : station_of_) ids[i] = id;
    Details contradictions(notices_, "dates left out for contradicting values");
    std::vector<std::vector<Value>> out(rows_.size());
    std::size_t repeated = 0;
    for (std::size_t i = 0; i < rows_.size(); ++i) {
      std::vector<Row>& rows = rows_[i];
      std::stable_sort(rows.begin(), rows.end(),
                       [](const Row& a, const Row& b) { return a.value.date < b.value.date; });
      for (std::size_t first = 0; first < rows.size();) {
        std::size_t end = first + 1;
        bool same = true;
        for (; end < rows.size() && rows[end].value.date == rows[first].value.date; ++end) {
          same = same && rows[end].value.value == rows[first].value.value;
        }
        if (same) {
          out[i].push_back(rows[first].value);
          repeated += end - first - 1;
        } else {
          contradictions.add(place(rows[end - 1]),
                             fmt::format("station '{}' has {} more than once with different values (first at {}); all "
                                         "are left out",
                                         ids[i], Dates::text(kind_, rows[first].value.date), place(rows[first])));
        }
        first = end;
      }
    }
    if (!tables_.empty()) contradictions.finish(tables_.front().file());
    if (repeated > 0) {
      notices_.add(tables_.front().file(),
                   fmt::format("{} rows repeat a station and date with the same value; one of each is kept", repeated));
    }
    return out;
  }

 private:
  [[nodiscard]] std::string place(const Row& row) const { return place_of(tables_[row.table], row.row); }

  std::vector<ValueColumn> observed_columns(const text::CsvTable& table) const {
    std::vector<ValueColumn> columns;
    std::string absent;
    for (const std::string& name : options_.observed) {
      const auto column = find_column(table, mapping_, name);
      if (!column) {
        absent = name;
        continue;
      }
      const Span span = kind_ == TableKind::daily ? Span::day : Span::month;
      columns.push_back(value_column(table, *column, mapping_, options_, span));
    }
    if (!absent.empty() && !columns.empty()) throw no_column(table, mapping_, absent);
    return columns;
  }

  bool read_table(std::size_t t) {
    const text::CsvTable& table = tables_[t];
    const std::vector<ValueColumn> columns = observed_columns(table);
    if (columns.empty()) return false;
    const std::size_t station = need_column(table, mapping_, "station");
    const Dates dates(table, kind_, mapping_, options_);
    if (table.rows() == 0) throw Error(Failure::data, table.file(), "no rows; expected one for each station and date");
    Details impossible(notices_, "impossible values left out");
    std::set<std::string> strangers;
    std::string last_id;
    std::size_t last = rows_.size();
    for (std::size_t row = 0; row < table.rows(); ++row) {
      const std::string_view id = table.at(row, station);
      if (id.empty()) throw Error(Failure::data, place_of(table, row), "no station; expected its identifier");
      if (id != last_id) {
        last_id = id;
        const auto found = station_of_.find(last_id);
        last = found == station_of_.end() ? rows_.size() : found->second;
        if (last == rows_.size()) strangers.insert(last_id);
      }
      double days = 1;
      const std::int64_t date = dates.date(row, days);
      const auto value = value_at(table, row, columns, days, impossible);
      if (value && last < rows_.size()) {
        rows_[last].push_back({{date, *value}, static_cast<std::uint32_t>(t), static_cast<std::uint32_t>(row)});
      }
    }
    impossible.finish(table.file());
    Details unknown(notices_, "stations have values but no site; they are left out");
    for (const std::string& id : strangers) {
      unknown.add(table.file(), fmt::format("station '{}' has values but no site; it is left out", id));
    }
    unknown.finish(table.file());
    return true;
  }

  /// The mean of the columns; nullopt when one is missing or impossible.
  std::optional<double> value_at(const text::CsvTable& table, std::size_t row, const std::vector<ValueColumn>& columns,
                                 double days, Details& impossible) const {
    double sum = 0;
    bool complete = true;
    for (const ValueColumn& c : columns) {
      const auto number = number_at(table, row, c.column);
      if (!number) {
        complete = false;
        continue;
      }
      const double value = c.value(*number, days);
      if (value < options_.low || value > options_.high) {
        impossible.add(
            place_of(table, row),
            fmt::format("station '{}', column '{}': {} is {:.6g} {}, outside {:.6g} to {:.6g}; it is left out",
                        table.at(row, need_column(table, mapping_, "station")), table.headings()[c.column].name,
                        table.at(row, c.column), value, options_.units, options_.low, options_.high));
        complete = false;
      }
      sum += value;
    }
    if (!complete) return std::nullopt;
    return sum / static_cast<double>(columns.size());
  }

  const std::vector<text::CsvTable>& tables_;
  TableKind kind_;
  const std::unordered_map<std::string, std::size_t>& station_of_;
  const Mapping& mapping_;
  const Options& options_;
  Notices& notices_;
  std::vector<std::vector<Row>> rows_;
};

}  // namespace

std::vector<std::vector<Value>> read_values(const std::vector<text::CsvTable>& tables, TableKind kind,
                                            const std::unordered_map<std::string, std::size_t>& station_of,
                                            const Mapping& mapping, const Options& options, Notices& notices,
                                            bool& found) {
  Reader reader(tables, kind, station_of, mapping, options, notices);
  found = reader.read() || found;
  return reader.values();
}

}  // namespace windrow::station
