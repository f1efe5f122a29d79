// The invented stations: where they stand, and thirty years of daily records with the gaps such records have.
#include "station_files.h"

#include <array>
#include <cmath>
#include <fstream>
#include <stdexcept>
#include <vector>

#include "days.h"
#include "invented.h"
#include "island.h"
#include "weather.h"

namespace demo {
namespace {

constexpr std::uint64_t kPlaceSeed = 31, kGapSeed = 32, kLocalSeed = 33;

struct Station {
  std::string id;
  double lon = 0, lat = 0, height_m = 0;
  int first_year = kFirstYear, last_year = kLastYear;
  Share temperature, rain;
};

std::string two_digits(int value) { return {static_cast<char>('0' + value / 10), static_cast<char>('0' + value % 10)}; }

/// "-3.7" from -37: records are kept in tenths.
std::string tenths(long value) {
  const long size = value < 0 ? -value : value;
  return (value < 0 ? "-" : "") + std::to_string(size / 10) + '.' + static_cast<char>('0' + size % 10);
}

double rounded(double value, double units) { return std::round(value * units) / units; }

/// Places on land, at least kStationSpacing_km apart, taken from a fixed sequence of candidates.
std::vector<Station> place_stations() {
  std::vector<Station> stations;
  for (std::uint64_t n = 0; stations.size() < kStations; ++n) {
    Station s;
    s.lon = rounded(kCentreLon + 2.4 * (uniform(kPlaceSeed, n, 0) - 0.5), 1000);
    s.lat = rounded(kCentreLat + 2.4 * (uniform(kPlaceSeed, n, 1) - 0.5), 1000);
    s.height_m = std::round(elevation_m(s.lon, s.lat));
    bool free = s.height_m > 0;
    for (const Station& other : stations) {
      free = free && distance_km(s.lon, s.lat, other.lon, other.lat) >= kStationSpacing_km;
    }
    if (!free) continue;
    const auto number = static_cast<int>(stations.size()) + 1;
    s.id = "K" + two_digits(number);
    if (number % 6 == 0) s.first_year = kFirstYear + number / 2;  // some began later
    if (number == kStations) s.last_year = kFirstYear + 6;        // and one closed too early to be of use
    stations.push_back(s);
  }
  return stations;
}

bool in_gap(std::size_t station, int day) {
  const auto block = static_cast<std::uint64_t>(day / kOutageEveryDays);
  const int begin = static_cast<int>(uniform(kGapSeed, station, block) * (kOutageEveryDays - kOutageDays));
  const int within = day % kOutageEveryDays;
  return (within >= begin && within < begin + kOutageDays) ||
         uniform(kGapSeed + 1, station, static_cast<std::uint64_t>(day)) < kMissingShare;
}

}  // namespace

void write_stations(const std::string& folder) {
  std::vector<Station> stations = place_stations();
  WeatherField temperature(kTemperatureNodes, kTemperatureMemory, kTrueWeatherSeed);
  WeatherField rain_field(kRainNodes, kRainMemory, kTrueWeatherSeed + 1);

  std::ofstream sites(folder + "/sites.csv", std::ios::binary);
  sites << "station,longitude,latitude,elevation,name\n";
  for (std::size_t i = 0; i < stations.size(); ++i) {
    Station& s = stations[i];
    s.temperature = temperature.point(s.lon, s.lat);
    s.rain = rain_field.point(s.lon, s.lat);
    sites << s.id << ',' << s.lon << ',' << s.lat << ',' << s.height_m << ',' << kStationNames[i] << '\n';
  }

  std::ofstream daily(folder + "/daily.csv", std::ios::binary);
  daily << "station,date,tas [degC],pr [mm/day]\n";
  constexpr std::array<int, 12> lengths{31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31};
  int month = 1, day_of_month = 1;
  for (Day day{false, kFirstYear}; day.year <= kLastYear; day.next()) {
    const std::string date = std::to_string(day.year) + '-' + two_digits(month) + '-' + two_digits(day_of_month);
    for (std::size_t i = 0; i < stations.size(); ++i) {
      const Station& s = stations[i];
      if (day.year < s.first_year || day.year > s.last_year || in_gap(i, day.number)) continue;
      const double t =
          true_temperature(s.lat, s.height_m, day.phase(), day.decades(), temperature.value(s.temperature)) +
          kLocalDeviation * normal(kLocalSeed, i, static_cast<std::uint64_t>(day.number));
      const double p = rain(s.height_m, day.phase(), day.decades(), rain_field.value(s.rain), 0, 1);
      daily << s.id << ',' << date << ',' << tenths(std::lround(10 * t)) << ',' << tenths(std::lround(10 * p)) << '\n';
    }
    temperature.next_day();
    rain_field.next_day();
    if (++day_of_month > lengths[month - 1] + (month == 2 && is_leap(day.year) ? 1 : 0)) {
      day_of_month = 1;
      month = month % 12 + 1;
    }
  }
  if (!sites.flush() || !daily.flush()) throw std::runtime_error(folder + ": station tables cannot be written");
}

}  // namespace demo
