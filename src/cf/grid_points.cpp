// Points: stations along one dimension, or one place (an area mean, a scalar coordinate) whose extent is not known.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

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

/// A series of one value: nothing but time, and no coordinates that could be anywhere. Its place is NaN.
std::optional<FileGrid> value_without_place(const Context& context) {
  const bool only_time = std::all_of(context.axes.begin(), context.axes.end(),
                                     [](const Axis& axis) { return axis.role == Role::time || axis.dim->length == 1; });
  const bool timed =
      std::any_of(context.axes.begin(), context.axes.end(), [](const Axis& axis) { return axis.role == Role::time; });
  if (!only_time || !timed || !context.variable.text("coordinates").empty() || !context.hints.coordinates.empty())
    return std::nullopt;
  for (const nc::Var& var : context.header().vars)
    if (var.dims.size() == 1 && context.axis(Role::time) != nullptr &&
        var.dims[0] == context.axis(Role::time)->dim->id && role_of(var) == Role::latitude)
      return std::nullopt;  // a track
  FileGrid result;
  result.grid.kind = GridKind::points;
  constexpr double kNowhere = std::numeric_limits<double>::quiet_NaN();
  result.grid.points = {{Angle::degrees(kNowhere), Angle::degrees(kNowhere)}};
  result.places.rows = {0};
  result.places.columns = {0};
  result.grid.how = "a series of one value, such as a mean over an area; it has no place";
  result.grid.why = "no dimension but time is longer than 1, and no coordinates";
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
  if (one.latitude == nullptr) return value_without_place(context);
  FileGrid result =
      points(context, read_degrees(context, *one.longitude, {}), read_degrees(context, *one.latitude, {}));
  result.grid.how = fmt::format("one point without extent at {:g} E, {:g} N", result.grid.points[0].longitude.degrees(),
                                result.grid.points[0].latitude.degrees());
  result.grid.why =
      fmt::format("single coordinates {} and {} without bounds", evidence(*one.latitude), evidence(*one.longitude));
  return result;
}

}  // namespace windrow::cf
