// Points: stations along one dimension, or one place (an area mean, a scalar coordinate) whose extent is not known.
#include <fmt/format.h>

#include <cmath>

#include "cell_list.h"

namespace windrow::cf {

namespace {

FileGrid points(const Context& context, const std::vector<double>& lon, const std::vector<double>& lat) {
  FileGrid result;
  result.grid.kind = GridKind::points;
  std::size_t missing = 0;
  for (std::size_t i = 0; i < lat.size(); ++i) {
    if (std::isnan(lat[i]) || std::isnan(lon[i])) {
      ++missing;
      continue;
    }
    result.places.rows.push_back(i);
    result.grid.points.push_back({Angle::degrees(lon[i]), Angle::degrees(lat[i])});
  }
  result.places.columns = {0};
  if (result.grid.points.empty()) context.fail("none of its points has coordinates");
  if (missing > 0)
    context.remarks.push_back(fmt::format("{} point{} without coordinates {} left out", missing, missing > 1 ? "s" : "",
                                          missing > 1 ? "are" : "is"));
  return result;
}

}  // namespace

std::optional<FileGrid> find_points(const Context& context) {
  if (const auto pair = latlon_pair(context, 1)) {
    FileGrid result = points(context, read_degrees(context, *pair->longitude, pair->dims),
                             read_degrees(context, *pair->latitude, pair->dims));
    result.dims = pair->dims;
    const bool stations = lower(context.header().text("featureType")) == "timeseries";
    result.grid.how =
        fmt::format("{} points without extent{}", result.grid.points.size(), stations ? " (stations)" : "");
    result.grid.why = fmt::format(
        "coordinates {} and {} over one dimension '{}' {}", evidence(*pair->latitude), evidence(*pair->longitude),
        context.header().dim(pair->dims[0]).name,
        stations ? "and featureType timeSeries" : "without vertex bounds, and not in rows of constant latitude");
    return result;
  }
  LatLonPair one;
  const Axis* lat = context.axis(Role::latitude);
  const Axis* lon = context.axis(Role::longitude);
  if (lat != nullptr && lon != nullptr && lat->dim->length == 1 && lon->dim->length == 1)
    one = {lat->values, lon->values, {}};
  for (const std::size_t rank : {0, 2})
    if (one.latitude == nullptr)
      if (const auto pair = latlon_pair(context, rank)) one = {pair->latitude, pair->longitude, {}};
  if (one.latitude == nullptr) return std::nullopt;
  FileGrid result =
      points(context, read_degrees(context, *one.longitude, {}), read_degrees(context, *one.latitude, {}));
  result.grid.how = fmt::format("one point without extent at {:g} E, {:g} N", result.grid.points[0].longitude.degrees(),
                                result.grid.points[0].latitude.degrees());
  result.grid.why =
      fmt::format("single coordinates {} and {} without bounds", evidence(*one.latitude), evidence(*one.longitude));
  return result;
}

}  // namespace windrow::cf
