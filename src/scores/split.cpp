// Lists of stations and years to fit and to score.
#include "windrow/scores/split.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "windrow/base/error.h"

namespace windrow::scores {
namespace {

/// Longitudes in degrees from the seam eastwards, 0 .. 360.
std::vector<double> unrolled(std::span<const GeoPoint> stations) {
  std::vector<double> longitude;
  for (const GeoPoint& station : stations) {
    const double turns = station.longitude.degrees() / 360;
    longitude.push_back(360 * (turns - std::floor(turns)));
  }
  std::vector<double> sorted = longitude;
  std::sort(sorted.begin(), sorted.end());
  double seam = sorted.front(), widest = sorted.front() + 360 - sorted.back();
  for (std::size_t i = 1; i < sorted.size(); ++i) {
    if (sorted[i] - sorted[i - 1] > widest) {
      widest = sorted[i] - sorted[i - 1];
      seam = sorted[i];
    }
  }
  for (double& value : longitude) value = value < seam ? value - seam + 360 : value - seam;
  return longitude;
}

struct Bisection {
  std::vector<double> latitude, longitude;
  std::vector<int> block;

  void divide(std::span<std::size_t> stations, int first, int blocks) {
    if (blocks == 1 || stations.empty()) {
      for (const std::size_t i : stations) block[i] = first;
      return;
    }
    const auto extent = [&stations](const std::vector<double>& values) {
      const auto [low, high] = std::minmax_element(stations.begin(), stations.end(),
                                                   [&values](auto a, auto b) { return values[a] < values[b]; });
      return std::make_pair(values[*low], values[*high]);
    };
    const auto [south, north] = extent(latitude);
    const auto [west, east] = extent(longitude);
    const double width = (east - west) * std::cos(Angle::degrees((south + north) / 2).radians());
    const std::vector<double>& along = width > north - south ? longitude : latitude;
    const std::vector<double>& across = width > north - south ? latitude : longitude;
    std::sort(stations.begin(), stations.end(), [&along, &across](std::size_t a, std::size_t b) {
      if (along[a] != along[b]) return along[a] < along[b];
      return across[a] != across[b] ? across[a] < across[b] : a < b;
    });
    const int half = blocks / 2;
    const auto share = stations.size() * static_cast<std::size_t>(half) / static_cast<std::size_t>(blocks);
    divide(stations.first(share), first, half);
    divide(stations.subspan(share), first + half, blocks - half);
  }
};

std::vector<YearSplit> both_ways(std::vector<int> first, std::vector<int> second) {
  return {{first, second}, {second, first}};
}

}  // namespace

std::vector<StationSplit> leave_blocks_out(const std::vector<int>& block, const Distance& distance, double radius_m) {
  std::vector<int> names = block;
  std::sort(names.begin(), names.end());
  names.erase(std::unique(names.begin(), names.end()), names.end());
  if (!names.empty() && names.front() < 0) {
    throw Error(Failure::defect, "blocks of stations", fmt::format("block {}; expected 0 or more", names.front()));
  }
  std::vector<StationSplit> splits;
  for (const int name : names) {
    StationSplit split;
    for (std::size_t i = 0; i < block.size(); ++i) {
      if (block[i] == name) split.scored.push_back(i);
    }
    for (std::size_t i = 0; i < block.size(); ++i) {
      if (block[i] == name) continue;
      const bool far = std::all_of(split.scored.begin(), split.scored.end(),
                                   [&distance, i, radius_m](std::size_t j) { return distance(i, j) > radius_m; });
      if (far) split.fitted.push_back(i);
    }
    splits.push_back(std::move(split));
  }
  return splits;
}

std::vector<StationSplit> leave_one_out(std::size_t stations, const Distance& distance, double radius_m) {
  std::vector<int> own(stations);
  std::iota(own.begin(), own.end(), 0);
  return leave_blocks_out(own, distance, radius_m);
}

std::vector<int> spatial_blocks(std::span<const GeoPoint> stations, int blocks) {
  if (blocks < 1) throw Error(Failure::defect, "blocks of stations", fmt::format("{} blocks", blocks));
  if (stations.empty()) return {};
  Bisection bisection;
  for (const GeoPoint& station : stations) bisection.latitude.push_back(station.latitude.degrees());
  bisection.longitude = unrolled(stations);
  bisection.block.resize(stations.size());
  std::vector<std::size_t> all(stations.size());
  std::iota(all.begin(), all.end(), std::size_t{0});
  bisection.divide(all, 0, blocks);
  return bisection.block;
}

std::vector<YearSplit> odd_and_even(std::span<const int> years) {
  std::vector<int> sorted(years.begin(), years.end()), odd, even;
  std::sort(sorted.begin(), sorted.end());
  for (const int year : sorted) (year % 2 != 0 ? odd : even).push_back(year);
  return both_ways(odd, even);
}

std::vector<YearSplit> halves(std::span<const int> years) {
  std::vector<int> sorted(years.begin(), years.end());
  std::sort(sorted.begin(), sorted.end());
  const auto middle = sorted.begin() + static_cast<std::ptrdiff_t>(sorted.size() / 2);
  return both_ways({sorted.begin(), middle}, {middle, sorted.end()});
}

}  // namespace windrow::scores
