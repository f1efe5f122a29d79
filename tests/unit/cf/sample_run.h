// Invented runs whose values tell where and when they belong, so that any mix-up of positions shows. Test only.
#pragma once
#include <algorithm>
#include <cmath>
#include <numeric>

#include "file_builder.h"
#include "windrow/cf/dataset.h"

namespace windrow::cftest {

/// The value at a place and time, exact in float32 for whole degrees and t < 40.
inline double value_at(double time, double latitude, double longitude) {
  const double east = std::fmod(std::fmod(longitude, 360) + 360, 360);
  return time * 262144 + (latitude + 90) * 1024 + east;
}

struct Sample {
  std::string name = "sample.nc";
  int mode = 0;
  nc_type type = NC_FLOAT;
  std::vector<std::string> order = {"time", "lat", "lon"};
  std::vector<double> lat = steps(-25, 10, 6), lon = steps(5, 10, 36), time = steps(0, 1, 4);
  std::string time_units = "days since 2000-01-01", calendar = "standard";
  double day_offset = 0.5;  ///< written times are time + this
  std::vector<std::size_t> chunks;
  std::function<void(FileBuilder&)> more = [](FileBuilder&) {};  ///< further attributes of `v`

  [[nodiscard]] std::string write() const {
    FileBuilder file(name, mode);
    std::vector<double> times = time;
    for (double& t : times) t += day_offset;
    file.dim("time", NC_UNLIMITED).dim("lat", lat.size()).dim("lon", lon.size()).dim("one", 1);
    file.var("time", NC_DOUBLE, {"time"}, times).att("units", time_units).att("calendar", calendar);
    file.var("lat", NC_DOUBLE, {"lat"}, lat).att("units", "degrees_north");
    file.var("lon", NC_DOUBLE, {"lon"}, lon).att("units", "degrees_east");
    file.var("v", type, order, values()).att("units", "K");
    if (!chunks.empty()) file.chunks(chunks);
    more(file);
    return file.done();
  }
  [[nodiscard]] std::vector<double> values() const {
    std::vector<std::size_t> length, index(order.size(), 0);
    const auto find = [&](const char* dim) { return std::size_t(std::ranges::find(order, dim) - order.begin()); };
    for (const std::string& dim : order)
      length.push_back(dim == "time" ? time.size() : dim == "lat" ? lat.size() : dim == "lon" ? lon.size() : 1);
    const std::size_t count = std::accumulate(length.begin(), length.end(), std::size_t{1}, std::multiplies<>());
    const std::size_t t = find("time"), y = find("lat"), x = find("lon");
    std::vector<double> result;
    for (std::size_t n = 0; n < count; ++n) {
      result.push_back(value_at(t < order.size() ? time[index[t]] : 0, lat[index[y]], lon[index[x]]));
      for (std::size_t i = order.size(); i-- > 0;) {
        if (++index[i] < length[i]) break;
        index[i] = 0;
      }
    }
    return result;
  }
};

inline std::vector<std::string> texts(const Notices& notices) {
  std::vector<std::string> list;
  for (const Notice& notice : notices.list()) list.push_back(notice.text);
  return list;
}
inline bool has(const Notices& notices, const std::string& part) {
  return std::ranges::any_of(notices.list(), [&](const Notice& n) { return n.text.find(part) != std::string::npos; });
}

inline std::vector<std::uint32_t> all_cells(const cf::RunVariable& run) {
  const auto& edges = run.grid().edges;
  std::vector<std::uint32_t> cells((edges.lat_deg.size() - 1) * (edges.lon_deg.size() - 1));
  std::iota(cells.begin(), cells.end(), 0);
  return cells;
}
inline std::vector<double> read_all(const cf::RunVariable& run) {
  const std::vector<std::uint32_t> cells = all_cells(run);
  std::vector<double> values(cells.size() * run.time().size());
  run.read(0, run.time().size(), cells, values.data());
  return values;
}

/// Every value stands at the cell and step it was made for (`times` as given to value_at).
inline void check_places(const cf::RunVariable& run, const std::vector<double>& times) {
  const auto& edges = run.grid().edges;
  const std::size_t nx = edges.lon_deg.size() - 1, ny = edges.lat_deg.size() - 1;
  const std::vector<double> values = read_all(run);
  REQUIRE(values.size() == times.size() * nx * ny);
  std::size_t wrong = 0;
  for (std::size_t t = 0; t < times.size(); ++t)
    for (std::size_t j = 0; j < ny; ++j)
      for (std::size_t i = 0; i < nx; ++i)
        wrong += values[(t * ny + j) * nx + i] != value_at(times[t],
                                                           std::round(0.5 * (edges.lat_deg[j] + edges.lat_deg[j + 1])),
                                                           std::round(0.5 * (edges.lon_deg[i] + edges.lon_deg[i + 1])));
  CHECK(wrong == 0);
}

}  // namespace windrow::cftest
