// Reading dated values: conversion, impossible values, duplicates.
#include "values.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>
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

 private:
  const text::CsvTable& table_;
  TableKind kind_;
  calendar::Calendar gregorian_;
  std::size_t first_ = 0, month_ = 0;
  std::vector<double> mean_length_;
};

Quantity quantity_of(const Options& options) {
  if (options.kind == Kind::sum) return options.per_day_rate ? Quantity::water : Quantity::other;
  try {
    units::conversion(options.units, "K", "", "");
    return Quantity::temperature;
  } catch (const Error&) {
    return Quantity::other;
  }
}

/// Values of the checks' own units: degC and mm/day.
units::Affine to_checked(const Options& options) {
  const Quantity quantity = quantity_of(options);
  if (quantity == Quantity::other) return {};
  return units::conversion(options.units, quantity == Quantity::water ? "mm/day" : "degC", "", "").affine;
}

/// The same in date order, one a date: of a date given twice the first.
DatedValues in_order(const DatedValues& read) {
  std::vector<std::size_t> order(read.date.size());
  std::iota(order.begin(), order.end(), 0U);
  std::stable_sort(order.begin(), order.end(), [&](auto a, auto b) { return read.date[a] < read.date[b]; });
  DatedValues out;
  for (const std::size_t i : order) {
    if (!out.date.empty() && out.date.back() == read.date[i]) continue;
    out.date.push_back(read.date[i]);
    out.value.push_back(read.value[i]);
  }
  return out;
}

class Reader {
 public:
  Reader(const std::vector<text::CsvTable>& tables, TableKind kind,
         const std::unordered_map<std::string, std::size_t>& station_of, const Mapping& mapping, const Options& options,
         const std::vector<bool>& hours_known, Notices& notices)
      : tables_(tables),
        kind_(kind),
        station_of_(station_of),
        mapping_(mapping),
        options_(options),
        hours_known_(hours_known),
        notices_(notices),
        rows_(station_of.size()),
        each_(options.observed.size(), std::vector<DatedValues>(station_of.size())) {}

  bool read() {
    bool found = false;
    for (std::size_t t = 0; t < tables_.size(); ++t) found = read_table(t) || found;
    return found;
  }

  std::vector<ObservedColumn> columns() const {
    const units::Affine checked = to_checked(options_);
    std::vector<ObservedColumn> out;
    for (std::size_t c = 0; c < each_.size(); ++c) {
      out.push_back({options_.observed[c], quantity_of(options_), kind_ != TableKind::daily, {}});
      for (const DatedValues& read : each_[c]) {
        out.back().of.push_back(in_order(read));
        for (double& x : out.back().of.back().value) x = checked(x);
      }
    }
    return out;
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
                                         ids[i], date_text(kind_, rows[first].value.date), place(rows[first])));
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
    const bool labelled = kind_ == TableKind::daily && !(t < hours_known_.size() && hours_known_[t]);
    const std::int64_t shift = labelled ? options_.day_shift : 0;
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
      const std::int64_t date = dates.date(row, days) + shift;
      const auto value = value_at(table, row, columns, days, impossible, {last, date});
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

  struct Element {
    std::size_t station;
    std::int64_t date;
  };

  /// The mean of the columns; nullopt when one is missing or impossible.
  std::optional<double> value_at(const text::CsvTable& table, std::size_t row, const std::vector<ValueColumn>& columns,
                                 double days, Details& impossible, Element element) {
    double sum = 0;
    bool complete = true;
    for (std::size_t i = 0; i < columns.size(); ++i) {
      const ValueColumn& c = columns[i];
      const auto number = number_at(table, row, c.column);
      if (!number) {
        complete = false;
        continue;
      }
      const double value = c.value(*number, days);
      if (element.station < rows_.size()) {
        each_[i][element.station].date.push_back(element.date);
        each_[i][element.station].value.push_back(value);
      }
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
  const std::vector<bool>& hours_known_;
  Notices& notices_;
  std::vector<std::vector<Row>> rows_;
  std::vector<std::vector<DatedValues>> each_;  // by observed column and station
};

}  // namespace

std::string date_text(TableKind kind, std::int64_t date) {
  if (kind == TableKind::daily) {
    return calendar::to_string(calendar::Calendar::from_cf("proleptic_gregorian", "").date(date));
  }
  if (kind == TableKind::normals) return fmt::format("month {}", date + 1);
  return fmt::format("{:04}-{:02}", date / 12, date % 12 + 1);
}

std::vector<std::vector<Value>> read_values(const std::vector<text::CsvTable>& tables, TableKind kind,
                                            const std::unordered_map<std::string, std::size_t>& station_of,
                                            const Mapping& mapping, const Options& options, Notices& notices,
                                            const std::vector<bool>& hours_known, bool& found,
                                            std::vector<ObservedColumn>& each) {
  Reader reader(tables, kind, station_of, mapping, options, hours_known, notices);
  found = reader.read() || found;
  each = reader.columns();
  return reader.values();
}

}  // namespace windrow::station
