// Units that slipped: each calendar year of a station is held against neighbours, its other years, or the Earth.
// The thresholds are this project's choice, made on monthly data of Colorado and daily data of two towns; the extremes
// of the Earth are common knowledge of the trade, from memory.
#include "quality_units.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <numeric>
#include <optional>

#include "distance.h"
#include "values.h"

namespace windrow::station {
namespace {

constexpr std::size_t kNeighbours = 5, kLeastNeighbours = 3, kOwnYears = 5;
constexpr double kReach_km = 500;
constexpr std::size_t kCommonDays = 200, kCommonMonths = 10;
constexpr std::size_t kYearDays = 330, kYearMonths = 12;

/// value = scale * right + offset, `right` being what the column's units would give.
struct Slip {
  const char* text;
  double scale, offset;
};
constexpr Slip kTemperature[] = {{"degF in a column of degC", 1.8, 32},
                                 {"K in a column of degC", 1, 273.15},
                                 {"tenths of degC", 10, 0},
                                 {"ten times too small", 0.1, 0}};
constexpr Slip kWater[] = {
    {"tenths of mm", 10, 0}, {"inches in a column of mm", 1 / 25.4, 0}, {"cm in a column of mm", 0.1, 0}};

struct Moments {
  std::size_t count = 0;
  double mean = 0, spread = 0;
};

Moments moments_of(const std::vector<double>& x) {
  Moments out{x.size(), 0, 0};
  if (x.empty()) return out;
  out.mean = std::accumulate(x.begin(), x.end(), 0.0) / static_cast<double>(x.size());
  double squares = 0;
  for (const double value : x) squares += (value - out.mean) * (value - out.mean);
  out.spread = std::sqrt(squares / static_cast<double>(x.size()));
  return out;
}

const Slip* temperature_slip(const Moments& here, const Moments& there) {
  if (!(here.spread > 0) || !(there.spread > 0)) return nullptr;
  const double ratio = std::log(here.spread / there.spread);
  if (std::abs(ratio) < std::log(1.5) && std::abs(here.mean - there.mean) < 15) return nullptr;
  for (const Slip& slip : kTemperature) {
    const bool spread = std::abs(ratio - std::log(slip.scale)) < std::log(1.35);
    if (spread && std::abs((here.mean - slip.offset) / slip.scale - there.mean) < 8) return &slip;
  }
  return nullptr;
}

const Slip* water_slip(const Moments& here, const Moments& there) {
  if (!(here.mean > 0) || !(there.mean > 0)) return nullptr;
  const double ratio = here.mean / there.mean;
  if (ratio > 6 && ratio < 17) return &kWater[0];
  if (ratio > 1.0 / 50 && ratio < 1 / 15.9) return &kWater[1];  // 15.9: between 25.4 and 10, in logarithms
  return ratio >= 1 / 15.9 && ratio < 1.0 / 6 ? &kWater[2] : nullptr;
}

const Slip* slip_of(Quantity quantity, const Moments& here, const Moments& there) {
  return quantity == Quantity::water ? water_slip(here, there) : temperature_slip(here, there);
}

/// Values of one calendar year.
struct Year {
  int year = 0;
  std::size_t first = 0, end = 0;
};

std::vector<Year> years_of(const DatedValues& series, bool monthly) {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "");
  std::vector<Year> out;
  for (std::size_t i = 0; i < series.date.size();) {
    const int year = monthly ? static_cast<int>(series.date[i] / 12) : gregorian.date(series.date[i]).year;
    const std::int64_t next = monthly ? (year + 1) * 12LL : gregorian.day_number({year + 1, 1, 1});
    const auto end = std::lower_bound(series.date.begin(), series.date.end(), next) - series.date.begin();
    out.push_back({year, i, static_cast<std::size_t>(end)});
    i = static_cast<std::size_t>(end);
  }
  return out;
}

std::vector<std::size_t> neighbours_of(std::size_t station, const std::vector<Site>& sites,
                                       const ObservedColumn& column) {
  std::vector<std::pair<double, std::size_t>> near;
  for (std::size_t i = 0; i < sites.size(); ++i) {
    if (i == station || column.of[i].date.empty()) continue;
    const double distance = distance_km(sites[station].position, sites[i].position);
    if (distance <= kReach_km) near.emplace_back(distance, i);
  }
  std::sort(near.begin(), near.end());
  std::vector<std::size_t> out;
  for (const auto& [distance, i] : near) {
    if (out.size() < kNeighbours) out.push_back(i);
  }
  return out;
}

/// Values of a year's dates that both have.
void common(const DatedValues& a, const Year& year, const DatedValues& b, std::vector<double>& here,
            std::vector<double>& there) {
  here.clear();
  there.clear();
  auto j =
      static_cast<std::size_t>(std::lower_bound(b.date.begin(), b.date.end(), a.date[year.first]) - b.date.begin());
  for (std::size_t i = year.first; i < year.end; ++i) {
    while (j < b.date.size() && b.date[j] < a.date[i]) ++j;
    if (j == b.date.size()) return;
    if (b.date[j] != a.date[i]) continue;
    here.push_back(a.value[i]);
    there.push_back(b.value[j]);
  }
}

struct Verdict {
  bool judged = false;
  const Slip* slip = nullptr;
};

/// What most neighbours say of a year; not judged with too few of them.
Verdict by_neighbours(const ObservedColumn& column, std::size_t station, const Year& year,
                      const std::vector<std::size_t>& neighbours) {
  std::map<const Slip*, std::size_t> votes;
  std::vector<double> here, there;
  std::size_t judges = 0;
  for (const std::size_t n : neighbours) {
    common(column.of[station], year, column.of[n], here, there);
    if (here.size() < (column.monthly ? kCommonMonths : kCommonDays)) continue;
    ++judges;
    ++votes[slip_of(column.quantity, moments_of(here), moments_of(there))];
  }
  if (judges < kLeastNeighbours) return {};
  for (const auto& [slip, count] : votes) {
    if (slip != nullptr && 2 * count > judges) return {true, slip};
  }
  return {true, nullptr};
}

double median(std::vector<double> x) {
  const auto middle = x.begin() + static_cast<std::ptrdiff_t>(x.size() / 2);
  std::nth_element(x.begin(), middle, x.end());
  return *middle;
}

/// A year against the station's other ones.
void by_own_years(const ObservedColumn& column, const DatedValues& series, const std::vector<Year>& years,
                  std::vector<Verdict>& verdicts) {
  std::vector<Moments> moments;
  std::vector<double> means, spreads;
  for (const Year& year : years) {
    const bool whole = year.end - year.first >= (column.monthly ? kYearMonths : kYearDays);
    const auto at = [&](std::size_t i) { return series.value.begin() + static_cast<std::ptrdiff_t>(i); };
    moments.push_back(whole ? moments_of({at(year.first), at(year.end)}) : Moments{});
    if (!whole) continue;
    means.push_back(moments.back().mean);
    spreads.push_back(moments.back().spread);
  }
  if (means.size() < kOwnYears) return;
  const Moments usual{1, median(means), median(spreads)};
  for (std::size_t y = 0; y < years.size(); ++y) {
    if (verdicts[y].judged || moments[y].count == 0) continue;
    verdicts[y] = {true, slip_of(column.quantity, moments[y], usual)};
  }
}

/// A whole station by what is possible on Earth: no place has a yearly mean of its days' highest temperature above 42
/// degC, nor above 33 beyond 35 degrees of latitude; none a spread of days over the year above 30 K, nor, beyond 30
/// degrees of latitude, below 0.8 K; none 13 m of rain a year as a mean; and where it rains on a twelfth of the days or
/// more, a day of rain brings more than half a millimetre.
const Slip* by_earth(const ObservedColumn& column, const DatedValues& series, const Site& site) {
  const Moments all = moments_of(series.value);
  if (all.count < (column.monthly ? kYearMonths : kYearDays)) return nullptr;
  const double latitude = std::abs(site.position.latitude.degrees());
  if (column.quantity == Quantity::water) {
    if (all.mean * 365 > 13000) return &kWater[0];
    const auto wet = std::count_if(series.value.begin(), series.value.end(), [](double x) { return x > 0; });
    const double share = static_cast<double>(wet) / static_cast<double>(all.count);
    return !column.monthly && share > 1.0 / 12 && all.mean / share < 0.5 ? &kWater[1] : nullptr;
  }
  if (all.mean > 200) return &kTemperature[1];
  if (all.spread > 30) return &kTemperature[2];
  if (all.mean > (latitude > 35 ? 33 : 42)) return &kTemperature[0];
  return latitude > 30 && all.spread < 0.8 ? &kTemperature[3] : nullptr;
}

struct Stretch {
  const Slip* slip;
  std::size_t first, end;  // years
};

/// Judged years of one verdict on end; years that could not be judged do not part them.
std::vector<Stretch> stretches_of(const std::vector<Verdict>& verdicts, bool water) {
  std::vector<Stretch> out;
  const auto judged = static_cast<std::size_t>(
      std::count_if(verdicts.begin(), verdicts.end(), [](const Verdict& v) { return v.judged; }));
  std::size_t years = 0;
  const auto close = [&] {
    if (water && years < 2 && judged > years) out.pop_back();  // one dry or wet year is no proof
    years = 0;
  };
  const Slip* last = nullptr;
  for (std::size_t y = 0; y < verdicts.size(); ++y) {
    if (!verdicts[y].judged) continue;
    const Slip* slip = verdicts[y].slip;
    if (slip != last && last != nullptr) close();
    if (slip != nullptr && slip != last) out.push_back({slip, y, y + 1});
    if (slip != nullptr) {
      out.back().end = y + 1;
      ++years;
    }
    last = slip;
  }
  if (last != nullptr) close();
  return out;
}

void report(const Site& site, const ObservedColumn& column, const DatedValues& series, std::size_t first,
            std::size_t end, const Slip& slip, std::vector<Finding>& out) {
  const TableKind kind = column.monthly ? TableKind::monthly : TableKind::daily;
  const std::string from = date_text(kind, series.date[first]), to = date_text(kind, series.date[end - 1]);
  const bool all = first == 0 && end == series.date.size();
  out.push_back({site.id, column.name, Fault::units, from, end - first,
                 fmt::format("station '{}', column '{}': {} {} values from {} to {} look like {}", site.id, column.name,
                             all ? "all" : "the", end - first, from, to, slip.text)});
}

}  // namespace

void find_other_units(const std::vector<Site>& sites, const ObservedColumn& column, std::vector<Finding>& out) {
  if (column.quantity == Quantity::other) return;
  for (std::size_t s = 0; s < sites.size(); ++s) {
    const DatedValues& series = column.of[s];
    const std::vector<Year> years = years_of(series, column.monthly);
    const auto neighbours = neighbours_of(s, sites, column);
    std::vector<Verdict> verdicts;
    verdicts.reserve(years.size());
    for (const Year& year : years) verdicts.push_back(by_neighbours(column, s, year, neighbours));
    const bool has_judges = std::any_of(verdicts.begin(), verdicts.end(), [](const Verdict& v) { return v.judged; });
    by_own_years(column, series, years, verdicts);
    const auto stretches = stretches_of(verdicts, column.quantity == Quantity::water);
    for (const Stretch& stretch : stretches) {
      report(sites[s], column, series, years[stretch.first].first, years[stretch.end - 1].end, *stretch.slip, out);
    }
    if (has_judges || !stretches.empty()) continue;
    if (const Slip* slip = by_earth(column, series, sites[s])) {
      report(sites[s], column, series, 0, series.date.size(), *slip, out);
    }
  }
}

}  // namespace windrow::station
