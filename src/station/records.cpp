// Records from values: complete months, complete years, what a station is used for.
#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <limits>

#include "columns.h"
#include "details.h"
#include "sites.h"
#include "values.h"
#include "windrow/station/quality.h"

namespace windrow::station {
namespace {

struct Series {
  DailySeries daily;
  std::vector<MonthlyValue> monthly;
  int complete_years = 0;
  int scarcest = 0;  // the calendar month, 0..11, with the fewest complete months
};

constexpr const char* kMonths[] = {"January", "February", "March",     "April",   "May",      "June",
                                   "July",    "August",   "September", "October", "November", "December"};

void count_years(Series& series) {
  std::array<int, 12> count{};
  for (const MonthlyValue& v : series.monthly) ++count[static_cast<std::size_t>(v.month - 1)];
  const auto least = std::min_element(count.begin(), count.end());
  series.complete_years = *least;
  series.scarcest = static_cast<int>(least - count.begin());
}

struct Tally {
  std::size_t months = 0, incomplete = 0;
};

/// Complete months of daily values, and their monthly values.
Series from_daily(const std::vector<Value>& values, const Options& options, Tally& tally) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "stations");
  Series series;
  for (std::size_t first = 0; first < values.size();) {
    const calendar::Date start = gregorian.date(values[first].date);
    const std::int64_t month_start = gregorian.day_number({start.year, start.month, 1});
    const int length = gregorian.days_in_month(start.year, start.month);
    std::vector<bool> present(static_cast<std::size_t>(length), false);
    double sum = 0;
    std::size_t end = first;
    for (; end < values.size() && values[end].date < month_start + length; ++end) {
      present[static_cast<std::size_t>(values[end].date - month_start)] = true;
      sum += values[end].value;
    }
    ++tally.months;
    if (month_complete(present, options.kind)) {
      for (std::size_t i = first; i < end; ++i) {
        series.daily.day.push_back(values[i].date);
        series.daily.value.push_back(values[i].value);
      }
      const bool amount = options.kind == Kind::sum && !options.per_day_rate;
      series.monthly.push_back({start.year, start.month, amount ? sum : sum / static_cast<double>(end - first)});
    } else {
      ++tally.incomplete;
    }
    first = end;
  }
  count_years(series);
  return series;
}

Series from_monthly(const std::vector<Value>& values) {
  Series series;
  for (const Value& v : values) {
    series.monthly.push_back({static_cast<int>(v.date / 12), static_cast<int>(v.date % 12) + 1, v.value});
  }
  count_years(series);
  return series;
}

std::vector<double> from_normals(const std::vector<Value>& values) {
  std::vector<double> normal;
  if (values.empty()) return normal;
  normal.assign(12, std::numeric_limits<double>::quiet_NaN());
  for (const Value& v : values) normal[static_cast<std::size_t>(v.date)] = v.value;
  return normal;
}

/// Daily before monthly where it has enough complete years; nothing, told, where neither has.
Series choose(Series daily, Series monthly, const Site& site, bool has_normals, int min_years, Notices& notices) {
  if (!daily.monthly.empty() && daily.complete_years >= min_years) return daily;
  if (!monthly.monthly.empty() && monthly.complete_years >= min_years) return monthly;
  const Series& longer = daily.complete_years > monthly.complete_years || monthly.monthly.empty() ? daily : monthly;
  notices.add(
      fmt::format("station '{}'", site.id),
      fmt::format("{} complete years (fewest in {}), at least {} are needed; {}", longer.complete_years,
                  kMonths[longer.scarcest], min_years, has_normals ? "only its normals are used" : "it is left out"));
  return {};
}

/// Everything observed times the station's factor; false, untouched, where it has none. The resolution remains the
/// gauge's own.
bool catch_more(Record& record, const std::map<std::string, double>& factors) {
  const auto factor = factors.find(record.site.id);
  if (factor == factors.end()) return false;
  for (double& x : record.daily.value) x *= factor->second;
  for (MonthlyValue& v : record.monthly) v.value *= factor->second;
  for (double& x : record.normal) x *= factor->second;
  return true;
}

/// Error for observed columns that no table has: the first one missing, against the first table there is.
[[noreturn]] void nowhere(const Tables& tables, const Mapping& mapping, const Options& options) {
  for (const auto* group : {&tables.daily, &tables.monthly, &tables.normals}) {
    if (!group->empty()) throw no_column(group->front(), mapping, options.observed.front());
  }
  throw Error(Failure::data, tables.sites.file(),
              "sites without values; expected daily, monthly or normals in [stations]");
}

}  // namespace

std::vector<Record> read_records(const Tables& tables, const Mapping& mapping, const Options& options,
                                 Notices& notices) {
  std::vector<Site> sites = read_sites(tables.sites, mapping, notices);
  std::unordered_map<std::string, std::size_t> station_of;
  for (std::size_t i = 0; i < sites.size(); ++i) station_of.emplace(sites[i].id, i);
  bool found = false;
  std::vector<ObservedColumn> each;
  const auto read = [&](const std::vector<text::CsvTable>& group, TableKind kind) {
    auto values = read_values(group, kind, station_of, mapping, options, notices, tables.hours_known, found, each);
    if (!group.empty() && kind != TableKind::normals) tell(check_columns(sites, each), group.front().file(), notices);
    return values;
  };
  tell(check_positions(sites), tables.sites.file(), notices);
  const auto factors = read_factors(tables.sites, mapping, options.undercatch);
  const auto daily = read(tables.daily, TableKind::daily);
  const auto monthly = read(tables.monthly, TableKind::monthly);
  const auto normals = read(tables.normals, TableKind::normals);
  if (!found) nowhere(tables, mapping, options);

  std::vector<Record> records;
  Tally tally;
  Details silent(notices, "stations have no value and are left out");
  Details factorless(notices, "stations have no undercatch factor and are left out");
  for (std::size_t i = 0; i < sites.size(); ++i) {
    Record record;
    record.normal = from_normals(normals[i]);
    Series series;
    if (!daily[i].empty() || !monthly[i].empty()) {
      series = choose(from_daily(daily[i], options, tally), from_monthly(monthly[i]), sites[i], !record.normal.empty(),
                      options.min_years, notices);
    } else if (record.normal.empty()) {
      silent.add(tables.sites.file(), fmt::format("station '{}' has no value and is left out", sites[i].id));
    }
    if (series.monthly.empty() && record.normal.empty()) continue;
    if (options.kind == Kind::sum) record.resolution = resolution_of(series.daily.value);
    record.daily = std::move(series.daily);
    record.monthly = std::move(series.monthly);
    record.complete_years = series.complete_years;
    record.site = std::move(sites[i]);
    if (!options.undercatch.empty() && !catch_more(record, factors)) {
      factorless.add(tables.sites.file(),
                     fmt::format("station '{}' has no undercatch factor in column '{}' and is left out", record.site.id,
                                 options.undercatch));
      continue;
    }
    records.push_back(std::move(record));
  }
  silent.finish(tables.sites.file());
  factorless.finish(tables.sites.file());
  if (tally.incomplete > 0) {
    notices.add(tables.daily.front().file(),
                fmt::format("{} of {} station months are incomplete and left out (WMO-No. 1203, 4.4)", tally.incomplete,
                            tally.months));
  }
  tell_oddities(records, tables.sites.file(), notices);
  return records;
}

}  // namespace windrow::station
