// [stations] and [reach]: what was observed where, and how far it counts.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>

#include "sections.h"
#include "windrow/text/words.h"
#include "windrow/units/units.h"

namespace windrow::job {

const Keys kStationKeys{
    {"sites", "daily", "monthly", "normals", "columns", "units", "normals_period", "min_years", "day", "undercatch"},
    {}};
const Keys kReachKeys{{"method", "radius", "power", "beyond", "neighbours"}, {"variogram"}};

namespace {

bool clock_time(const std::string& text) {
  if (text.size() != 5 || text[2] != ':') return false;
  for (const std::size_t i : {0U, 1U, 3U, 4U})
    if (std::isdigit(static_cast<unsigned char>(text[i])) == 0) return false;
  const int minutes = (text[0] - '0') * 600 + (text[1] - '0') * 60 + (text[3] - '0') * 10 + (text[4] - '0');
  return text[3] < '6' && minutes <= 24 * 60;
}

// What is known of the hours a station's day covers, as a sentence part for the product.
std::string day_note(const Table& stations) {
  const auto table = stations.table("day", "'day' of [stations]", {{"ends", "zone", "label"}, {}});
  if (!table) return {};
  const std::string ends = table->text("ends", "24:00");
  if (!clock_time(ends)) table->fail("ends", "'ends' is no time of day; expected one from \"00:00\" to \"24:00\"");
  const std::string zone = table->text("zone", "UTC");
  const bool at_end = table->word<bool>("label", {{{"start", false}, {"end", true}}, {}}, true);
  return fmt::format("a station day ends at {} {} and carries the date of its {}", ends, zone,
                     at_end ? "end" : "start");
}

void read_mappings(const Table& table, StationSpec& stations) {
  const std::vector<std::string> names{"station", "longitude", "latitude", "elevation",
                                       "name",    "date",      "year",     "month"};
  for (const auto& [name, heading] : table.text_table("columns")) {
    if (std::find(names.begin(), names.end(), name) == names.end()) {
      const std::string nearest = text::nearest_word(name, names);
      table.fail("columns", fmt::format("unknown column '{}'; {}", printable(name),
                                        nearest.empty() ? "expected " + text::alternatives(names)
                                                        : "did you mean '" + nearest + "'?"));
    }
    stations.columns.emplace(name, heading);
  }
  for (const auto& [heading, written] : table.text_table("units")) {
    std::string odd, amount;
    const std::string repaired = units::repaired(written, &odd);
    if (written.empty() || written.size() > 200 || (!units::known(repaired) && !units::per_month(written, &amount)))
      table.fail("units", fmt::format("units '{}' of column '{}' are not known to UDUNITS; expected units such as degC "
                                      "or mm/day",
                                      printable(written), printable(heading)));
    stations.units.emplace(heading, written);
  }
}

double radius_m(const Table& table, double otherwise) {
  const std::optional<std::string> written = table.text("radius");
  if (!written) return otherwise;
  std::optional<double> metres;
  if (const auto quantity = text::parse_quantity(*written)) {
    try {
      metres = units::conversion(quantity->second, "m", "", table.title()).affine(quantity->first);
    } catch (const Error&) {
      metres.reset();
    }
  }
  if (!metres || !(*metres > 0) || *metres > 1e8)
    table.fail("radius", fmt::format("'{}' is no distance; expected one such as \"300 km\"", printable(*written)));
  return *metres;
}

}  // namespace

std::optional<std::pair<int, int>> read_years(const Table& table, const std::string& key) {
  const auto years = table.numbers(key, 2);
  if (!years) return std::nullopt;
  for (const Value& item : table.find(key)->items)
    if (item.kind != Value::Kind::whole || item.whole < 1 || item.whole > 9999)
      table.document().fail(item.at, fmt::format("an entry of '{}' is no year; expected one such as 1981", key));
  if ((*years)[1] < (*years)[0])
    table.fail(key, fmt::format("'{}' ends in {}, before it begins in {}; expected the first year first", key,
                                (*years)[1], (*years)[0]));
  return std::pair{static_cast<int>((*years)[0]), static_cast<int>((*years)[1])};
}

StationSpec read_stations(const Table& table) {
  StationSpec stations;
  stations.given = true;
  if (!table.has("sites")) table.missing("sites", "a CSV file with station, longitude, latitude and elevation");
  stations.sites = table.path("sites");
  stations.daily = table.paths("daily");
  stations.monthly = table.paths("monthly");
  stations.normals = table.paths("normals");
  if (stations.daily.empty() && stations.monthly.empty() && stations.normals.empty())
    table.document().fail(table.at(), "[stations] has no values; expected 'daily', 'monthly' or 'normals'");
  if (!stations.daily.empty() && !stations.monthly.empty())
    table.fail("monthly", "'monthly' stands beside 'daily'; expected one of them");
  read_mappings(table, stations);
  stations.normals_period = read_years(table, "normals_period");
  stations.min_years = table.whole("min_years", stations.min_years, 1, 1000);
  stations.day_note = day_note(table);
  if (table.text("undercatch", "none") != "none")
    table.fail("undercatch", "a factor for 'undercatch' is not in this version; expected none");
  return stations;
}

ReachSpec read_reach(const Table& table) {
  ReachSpec reach;
  reach.method =
      table.word<ReachMethod>("method",
                              {{{"nearest", ReachMethod::nearest}, {"inverse-distance", ReachMethod::inverse_distance}},
                               {"kriging", "kriging-height"}},
                              reach.method);
  reach.radius_m = radius_m(table, reach.radius_m);
  reach.power = table.number("power", reach.power, 0.1, 16);
  reach.beyond = table.word<Beyond>(
      "beyond", {{{"taper", Beyond::taper}, {"raw", Beyond::raw}, {"missing", Beyond::missing}}, {}}, reach.beyond);
  reach.neighbours = table.whole("neighbours", reach.neighbours, 1, 10000);
  return reach;
}

}  // namespace windrow::job
