// Checks of values by themselves and in pairs: twins, stuck values, swapped extremes, a gauge's resolution. Units are
// checked in quality_units.cpp, sites in quality_sites.cpp.
#include "windrow/station/quality.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>

#include "details.h"
#include "quality_units.h"
#include "values.h"

namespace windrow::station {
namespace {

constexpr double kTwinShare = 0.95;
constexpr std::size_t kTwinDays = 365, kTwinMonths = 60;
constexpr std::size_t kStuckDays = 10, kStuckWetDays = 7, kStuckMonths = 6;
constexpr std::size_t kResolutionValues = 20;
constexpr double kNoStep = 1e-6;  // of the value: differences of representation

std::string date_of(const ObservedColumn& column, std::int64_t date) {
  return date_text(column.monthly ? TableKind::monthly : TableKind::daily, date);
}

struct Common {
  std::size_t count = 0, equal = 0;
  std::int64_t first = 0;
};

/// What is not zero: dry days agree everywhere.
DatedValues without_zeros(const DatedValues& series) {
  DatedValues out;
  for (std::size_t i = 0; i < series.date.size(); ++i) {
    if (series.value[i] == 0) continue;
    out.date.push_back(series.date[i]);
    out.value.push_back(series.value[i]);
  }
  return out;
}

/// Given up, with nothing in common, as soon as more differ than a twin may have.
Common compare(const DatedValues& a, const DatedValues& b) {
  const double most = (1 - kTwinShare) * static_cast<double>(std::min(a.date.size(), b.date.size()));
  Common out;
  for (std::size_t i = 0, j = 0; i < a.date.size() && j < b.date.size();) {
    if (a.date[i] != b.date[j]) {
      ++(a.date[i] < b.date[j] ? i : j);
      continue;
    }
    if (out.count == 0) out.first = a.date[i];
    ++out.count;
    out.equal += a.value[i] == b.value[j] ? 1 : 0;
    if (static_cast<double>(out.count - out.equal) > most) return {};
    ++i;
    ++j;
  }
  return out;
}

void find_twins(const std::vector<Site>& sites, const ObservedColumn& column, std::vector<Finding>& out) {
  const std::size_t least = column.monthly ? kTwinMonths : kTwinDays;
  std::vector<DatedValues> compared;
  compared.reserve(sites.size());
  for (const DatedValues& series : column.of) compared.push_back(without_zeros(series));
  for (std::size_t a = 0; a < sites.size(); ++a) {
    for (std::size_t b = a + 1; b < sites.size(); ++b) {
      const Common common = compare(compared[a], compared[b]);
      if (common.count < least || static_cast<double>(common.equal) <= kTwinShare * static_cast<double>(common.count))
        continue;
      out.push_back({sites[a].id, column.name, Fault::twin_series, date_of(column, common.first), common.equal,
                     fmt::format("stations '{}' and '{}', column '{}': {} of {} common values that are not zero are "
                                 "equal (from {}); one may be a copy of the other",
                                 sites[a].id, sites[b].id, column.name, common.equal, common.count,
                                 date_of(column, common.first))});
    }
  }
}

void find_stuck(const std::vector<Site>& sites, const ObservedColumn& column, std::vector<Finding>& out) {
  const std::size_t least = column.monthly                       ? kStuckMonths
                            : column.quantity == Quantity::water ? kStuckWetDays
                                                                 : kStuckDays;
  for (std::size_t s = 0; s < sites.size(); ++s) {
    const auto& [date, value] = column.of[s];
    for (std::size_t first = 0; first < date.size();) {
      std::size_t end = first + 1;
      while (end < date.size() && value[end] == value[first] && date[end] == date[end - 1] + 1) ++end;
      if (end - first >= least && value[first] != 0) {
        out.push_back(
            {sites[s].id, column.name, Fault::stuck, date_of(column, date[first]), end - first,
             fmt::format("station '{}', column '{}': {:.6g} on {} {} in a row from {}", sites[s].id, column.name,
                         value[first], end - first, column.monthly ? "months" : "days", date_of(column, date[first]))});
      }
      first = end;
    }
  }
}

/// The column of the highest values that belongs to one of the lowest: its name with "max" for "min".
const ObservedColumn* upper_of(const ObservedColumn& lower, const std::vector<ObservedColumn>& columns) {
  for (const auto& [low, high] : {std::pair("min", "max"), std::pair("Min", "Max"), std::pair("MIN", "MAX")}) {
    const auto at = lower.name.find(low);
    if (at == std::string::npos) continue;
    const std::string wanted = std::string(lower.name).replace(at, 3, high);
    for (const ObservedColumn& column : columns) {
      if (column.name == wanted && column.monthly == lower.monthly) return &column;
    }
  }
  return nullptr;
}

void find_swapped(const std::vector<Site>& sites, const ObservedColumn& lower, const ObservedColumn& upper,
                  std::vector<Finding>& out) {
  for (std::size_t s = 0; s < sites.size(); ++s) {
    const DatedValues &a = lower.of[s], &b = upper.of[s];
    std::size_t both = 0, turned = 0;
    std::int64_t first = 0;
    for (std::size_t i = 0, j = 0; i < a.date.size() && j < b.date.size();) {
      if (a.date[i] != b.date[j]) {
        ++(a.date[i] < b.date[j] ? i : j);
        continue;
      }
      ++both;
      if (a.value[i] > b.value[j] && turned++ == 0) first = a.date[i];
      ++i;
      ++j;
    }
    if (turned == 0) continue;
    const char* span = lower.monthly ? "months" : "days";
    const std::string what = 2 * turned > both ? "; the columns seem to be swapped" : "";
    out.push_back({sites[s].id, lower.name, Fault::swapped, date_of(lower, first), turned,
                   fmt::format("station '{}': '{}' is above '{}' on {} of {} {} (from {}){}", sites[s].id, lower.name,
                               upper.name, turned, both, span, date_of(lower, first), what)});
  }
}

const char* rest_of(Fault fault) {
  switch (fault) {
    case Fault::twin_series:
      return "pairs of stations with nearly the same values";
    case Fault::stuck:
      return "stretches of one value";
    case Fault::units:
      return "stretches that look like other units";
    case Fault::swapped:
      return "stations with lowest values above the highest";
    case Fault::longitude_sign:
      return "stations whose longitude may have the wrong sign";
    case Fault::elevation:
      return "stations whose elevation is far from the relief's";
  }
  return "findings";
}

}  // namespace

std::vector<Finding> check_columns(const std::vector<Site>& sites, const std::vector<ObservedColumn>& columns) {
  std::vector<Finding> out;
  for (const ObservedColumn& column : columns) {
    find_twins(sites, column, out);
    find_stuck(sites, column, out);
    find_other_units(sites, column, out);
    if (const ObservedColumn* upper = upper_of(column, columns)) find_swapped(sites, column, *upper, out);
  }
  return out;
}

double resolution_of(const std::vector<double>& values) {
  std::vector<double> sorted;
  for (const double x : values) {
    if (x > 0) sorted.push_back(x);
  }
  if (sorted.size() < kResolutionValues) return std::numeric_limits<double>::quiet_NaN();
  std::sort(sorted.begin(), sorted.end());
  double step = sorted.front();
  for (std::size_t i = 1; i < sorted.size(); ++i) {
    const double difference = sorted[i] - sorted[i - 1];
    if (difference > kNoStep * sorted[i]) step = std::min(step, difference);
  }
  return step;
}

void tell(const std::vector<Finding>& findings, const std::string& place, Notices& notices) {
  std::map<Fault, Details> kinds;
  for (const Finding& finding : findings) {
    kinds.try_emplace(finding.fault, notices, rest_of(finding.fault)).first->second.add(place, finding.sentence);
  }
  for (auto& [fault, details] : kinds) details.finish(place);
}

}  // namespace windrow::station
