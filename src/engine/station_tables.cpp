#include "station_tables.h"

#include "windrow/cf/dataset.h"
#include "windrow/cf/stations.h"
#include "windrow/os/files.h"

namespace windrow::engine {
namespace {

text::CsvTable csv(const std::string& path) { return text::CsvTable::parse(os::read_text(path), path); }

void read_group(const std::vector<std::string>& paths, cf::StationSpan span, const std::vector<std::string>& observed,
                Notices& notices, std::vector<text::CsvTable>& out, std::vector<bool>& hours_known) {
  for (const auto& path : paths) {
    cf::StationValues values;
    if (cf::looks_like_netcdf(path)) {
      values = cf::read_station_values(path, span, observed, notices);
    } else {
      values.table = csv(path);
    }
    out.push_back(std::move(values.table));
    hours_known.push_back(values.hours_known);
  }
}

}  // namespace

station::Tables station_tables(const job::StationSpec& spec, const std::vector<std::string>& observed,
                               Notices& notices) {
  const std::vector<std::string> sites = !spec.sites.empty()   ? std::vector{spec.sites}
                                         : !spec.daily.empty() ? spec.daily
                                                               : spec.monthly;
  station::Tables out;
  out.sites = cf::looks_like_netcdf(sites.front()) ? cf::read_station_sites(sites, notices) : csv(sites.front());
  std::vector<bool> unused;
  read_group(spec.daily, cf::StationSpan::day, observed, notices, out.daily, out.hours_known);
  read_group(spec.monthly, cf::StationSpan::month, observed, notices, out.monthly, unused);
  for (const auto& path : spec.normals) out.normals.push_back(csv(path));
  return out;
}

bool is_precipitation(const std::string& standard_name) {
  for (const char* word : {"precipitation", "rainfall", "snowfall"}) {
    if (standard_name.find(word) != std::string::npos) return true;
  }
  return false;
}

}  // namespace windrow::engine
