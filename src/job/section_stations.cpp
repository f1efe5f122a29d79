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

std::optional<std::pair<int, int>> normals_period(const Table& table) {
  const auto years = table.numbers("normals_period", 2);
  if (!years) return std::nullopt;
  for (const Value& item : table.find("normals_period")->items)
    if (item.kind != Value::Kind::whole || item.whole < 1 || item.whole > 9999)
      table.document().fail(item.at, "an entry of 'normals_period' is no year; expected one such as 1981");
  if ((*years)[1] < (*years)[0])
    table.fail("normals_period", fmt::format("'normals_period' ends in {}, before it begins in {}; expected the first "
                                             "year first",
                                             (*years)[1], (*years)[0]));
  return std::pair{static_cast<int>((*years)[0]), static_cast<int>((*years)[1])};
}

}  // namespace

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
  stations.normals_period = normals_period(table);
  stations.min_years = table.whole("min_years", stations.min_years, 1, 1000);
  stations.day_note = day_note(table);
  if (table.text("undercatch", "none") != "none")
    table.fail("undercatch", "a factor for 'undercatch' is not in this version; expected none");
  return stations;
}

}  // namespace windrow::job
