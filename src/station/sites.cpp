// Reading sites: identity, position, elevation.
#include "sites.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <unordered_map>

#include "columns.h"
#include "details.h"

namespace windrow::station {
namespace {

constexpr double kMostFactor = 10;

struct SiteColumns {
  std::size_t station, longitude, latitude;
  std::optional<std::size_t> elevation, name;
  units::Affine to_metres;
};

SiteColumns find_columns(const text::CsvTable& table, const Mapping& mapping) {
  SiteColumns c{need_column(table, mapping, "station"),  need_column(table, mapping, "longitude"),
                need_column(table, mapping, "latitude"), find_column(table, mapping, "elevation"),
                find_column(table, mapping, "name"),     {}};
  if (!c.elevation && mapping.columns.contains("elevation")) throw no_column(table, mapping, "elevation");
  if (c.elevation) {
    const std::string units = units_of(table, *c.elevation, mapping);
    const std::string place = fmt::format("{}: column '{}'", table.file(), table.headings()[*c.elevation].name);
    if (!units.empty()) c.to_metres = units::conversion(units, "m", "", place).affine;
  }
  return c;
}

bool same_place(const Site& a, const Site& b) {
  const bool elevation = a.elevation_m == b.elevation_m || (std::isnan(a.elevation_m) && std::isnan(b.elevation_m));
  return a.position.longitude == b.position.longitude && a.position.latitude == b.position.latitude && elevation;
}

}  // namespace

std::vector<Site> read_sites(const text::CsvTable& table, const Mapping& mapping, Notices& notices) {
  const SiteColumns c = find_columns(table, mapping);
  if (table.rows() == 0) throw Error(Failure::data, table.file(), "no rows; expected one for each station");
  Details places(notices, "sites left out for their coordinates");
  std::vector<Site> sites;
  std::vector<bool> ambiguous;
  std::unordered_map<std::string, std::size_t> seen;
  for (std::size_t row = 0; row < table.rows(); ++row) {
    Site site;
    site.id = table.at(row, c.station);
    if (site.id.empty()) throw Error(Failure::data, place_of(table, row), "no station; expected its identifier");
    if (c.name) site.name = table.at(row, *c.name);
    const auto longitude = number_at(table, row, c.longitude), latitude = number_at(table, row, c.latitude);
    const auto elevation = c.elevation ? number_at(table, row, *c.elevation) : std::nullopt;
    site.elevation_m = elevation ? c.to_metres(*elevation) : std::numeric_limits<double>::quiet_NaN();
    if (!longitude || !latitude) {
      places.add(place_of(table, row), fmt::format("station '{}' has no coordinates and is left out", site.id));
      continue;
    }
    if (std::abs(*latitude) > 90 || *longitude < -180 || *longitude > 360) {
      places.add(place_of(table, row),
                 fmt::format("station '{}' at longitude {}, latitude {} is on no globe and is left out", site.id,
                             *longitude, *latitude));
      continue;
    }
    site.position = {Angle::degrees(*longitude), Angle::degrees(*latitude)};
    const auto [found, is_new] = seen.emplace(site.id, sites.size());
    if (is_new) {
      sites.push_back(site);
      ambiguous.push_back(false);
    } else if (same_place(sites[found->second], site)) {
      notices.add(place_of(table, row), fmt::format("station '{}' stands twice; one is kept", site.id));
    } else {
      ambiguous[found->second] = true;
      notices.add(place_of(table, row),
                  fmt::format("station '{}' stands twice with different positions; both are left out", site.id));
    }
  }
  places.finish(table.file());
  std::vector<Site> kept;
  for (std::size_t i = 0; i < sites.size(); ++i) {
    if (!ambiguous[i]) kept.push_back(std::move(sites[i]));
  }
  return kept;
}

std::map<std::string, double> read_factors(const text::CsvTable& table, const Mapping& mapping,
                                           const std::string& column) {
  std::map<std::string, double> factors;
  if (column.empty()) return factors;
  const int found = table.column(column);
  if (found < 0) {
    std::vector<std::string> names;
    for (const text::Heading& heading : table.headings()) names.push_back(heading.name);
    throw Error(Failure::data, table.file(),
                fmt::format("no column '{}' of undercatch factors; it has {}", column, fmt::join(names, ", ")));
  }
  const std::size_t station = need_column(table, mapping, "station");
  for (std::size_t row = 0; row < table.rows(); ++row) {
    const auto factor = number_at(table, row, static_cast<std::size_t>(found));
    if (!factor) continue;
    if (!(*factor > 0) || *factor > kMostFactor) {
      throw Error(Failure::data, place_of(table, row),
                  fmt::format("column '{}': {} is no undercatch factor; expected one above 0 and at most {}", column,
                              *factor, kMostFactor));
    }
    factors.emplace(std::string(table.at(row, station)), *factor);
  }
  return factors;
}

void tell_oddities(const std::vector<Record>& records, const std::string& file, Notices& notices) {
  Details heights(notices, "stations have no elevation");
  for (const Record& r : records) {
    if (!std::isnan(r.site.elevation_m)) continue;
    heights.add(file, fmt::format("station '{}' has no elevation; nothing that needs heights can use it", r.site.id));
  }
  heights.finish(file);
  std::vector<std::size_t> order(records.size());
  std::iota(order.begin(), order.end(), 0u);
  const auto position = [&](std::size_t i) {
    return std::make_pair(records[i].site.position.longitude, records[i].site.position.latitude);
  };
  std::stable_sort(order.begin(), order.end(), [&](auto a, auto b) { return position(a) < position(b); });
  Details twins(notices, "stations stand at another one's position");
  for (std::size_t i = 1; i < order.size(); ++i) {
    if (position(order[i]) != position(order[i - 1])) continue;
    twins.add(file, fmt::format("stations '{}' and '{}' stand at the same position; both are used",
                                records[order[i - 1]].site.id, records[order[i]].site.id));
  }
  twins.finish(file);
}

}  // namespace windrow::station
