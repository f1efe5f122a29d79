// [stations]: what was observed where.
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

namespace {

constexpr int kDayMinutes = 24 * 60;

/// Minutes of "HH:MM", up to 24:00; nothing for other text.
std::optional<int> clock_minutes(const std::string& text) {
  if (text.size() != 5 || text[2] != ':') return std::nullopt;
  for (const std::size_t i : {0U, 1U, 3U, 4U})
    if (std::isdigit(static_cast<unsigned char>(text[i])) == 0) return std::nullopt;
  const int minutes = (text[0] - '0') * 600 + (text[1] - '0') * 60 + (text[3] - '0') * 10 + (text[4] - '0');
  if (text[3] > '5' || minutes > kDayMinutes) return std::nullopt;
  return minutes;
}

/// Minutes ahead of UTC of "UTC", "UTC+1", "UTC-03:30"; nothing for other text.
std::optional<int> zone_minutes(const std::string& text) {
  if (text == "UTC") return 0;
  if (text.size() < 5 || !text.starts_with("UTC") || (text[3] != '+' && text[3] != '-')) return std::nullopt;
  std::string clock = text.substr(4);
  if (clock.find(':') == std::string::npos) clock += ":00";
  if (clock.size() == 4) clock.insert(0, "0");
  const auto minutes = clock_minutes(clock);
  if (!minutes || *minutes > 14 * 60) return std::nullopt;
  return text[3] == '-' ? -*minutes : *minutes;
}

/// Whole days from the date a value carries to the UTC date that holds most of its hours; on a tie the nearer one.
int shift_of(int ends, int zone, bool labelled_at_end) {
  const int begin = labelled_at_end ? ends - kDayMinutes : ends % kDayMinutes;
  const int middle = begin + kDayMinutes / 2 - zone;  // minutes from the date's 00:00 UTC
  const int day = middle >= 0 ? middle / kDayMinutes : -((-middle + kDayMinutes - 1) / kDayMinutes);
  const bool tie = middle % kDayMinutes == 0;
  return tie && day > 0 ? day - 1 : day;
}

// The hours a station's day covers: the days its dates move by, and a sentence for the product.
void read_day(const Table& table, StationSpec& stations) {
  const auto day = table.table("day", "'day' of [stations]", {{"ends", "zone", "label"}, {}});
  if (!day) return;
  const std::string ends = day->text("ends", "24:00");
  const auto minutes = clock_minutes(ends);
  if (!minutes) day->fail("ends", "'ends' is no time of day; expected one from \"00:00\" to \"24:00\"");
  const std::string zone = day->text("zone", "UTC");
  const auto offset = zone_minutes(zone);
  if (!offset)
    day->fail("zone", fmt::format("'{}' is no zone; expected UTC or hours ahead of it, such as \"UTC+1\" or "
                                  "\"UTC-3:30\"",
                                  printable(zone)));
  const bool at_end = day->word<bool>("label", {{{"start", false}, {"end", true}}, {}}, true);
  stations.day_shift = shift_of(*minutes, *offset, at_end);
  stations.day_note =
      fmt::format("A station day ends at {} {} and carries the date of its {}", ends, zone, at_end ? "end" : "start");
  if (stations.day_shift != 0 && !stations.daily.empty())
    stations.day_note += fmt::format(
        "; daily values without time bounds are moved by {:+} day to the date that holds "
        "most of their hours",
        stations.day_shift);
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
  stations.daily = table.paths("daily");
  stations.monthly = table.paths("monthly");
  stations.normals = table.paths("normals");
  if (stations.daily.empty() && stations.monthly.empty() && stations.normals.empty())
    table.document().fail(table.at(), "[stations] has no values; expected 'daily', 'monthly' or 'normals'");
  if (!stations.daily.empty() && !stations.monthly.empty())
    table.fail("monthly", "'monthly' stands beside 'daily'; expected one of them");
  if (table.has("sites")) stations.sites = table.path("sites");
  const auto& series = stations.daily.empty() ? stations.monthly : stations.daily;
  const bool hold_sites = !series.empty() && std::ranges::all_of(series, [](const auto& path) {
    return path.ends_with(".nc") || path.ends_with(".nc4");
  });
  if (stations.sites.empty() && !hold_sites)
    table.missing("sites", "a CSV file with station, longitude, latitude and elevation");
  read_mappings(table, stations);
  stations.normals_period = read_years(table, "normals_period");
  stations.min_years = table.whole("min_years", stations.min_years, 1, 1000);
  read_day(table, stations);
  stations.undercatch = table.text("undercatch", "none");
  if (stations.undercatch.empty())
    table.fail("undercatch", "'undercatch' is empty; expected none or a column of the sites table");
  if (stations.undercatch == "none") stations.undercatch.clear();
  if (!stations.undercatch.empty() && stations.sites.empty())
    table.fail("undercatch", "factors for 'undercatch' stand in a sites table; expected 'sites' in [stations]");
  return stations;
}

}  // namespace windrow::job
