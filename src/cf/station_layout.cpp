// Telling the layouts of CF 1.13, appendix H.2, apart. No values but the counts and indexes of ragged arrays are read.
#include "station_layout.h"

#include <fmt/format.h>

#include <algorithm>

#include "roles.h"

namespace windrow::cf {
namespace {

Error bad(const Header& header, const std::string& text) { return {Failure::data, header.path, text}; }

int dim_named(const Header& header, const std::string& name, const nc::Var& variable) {
  for (const nc::Dim& dim : header.dims)
    if (dim.name == name) return dim.id;
  throw bad(header, fmt::format("'{}' names the dimension '{}', which the file does not have", variable.name, name));
}

/// Of the identifier: its first dimension, unless that is the length of a single text.
int station_dimension(const Header& header, const nc::Var& id) {
  if (id.dims.empty()) return -1;
  if (id.type != NC_CHAR || id.dims.size() > 1) return id.dims[0];
  for (const nc::Var& other : header.vars) {
    const Role role = role_of(other);
    if (role == Role::latitude && other.dims == id.dims) return id.dims[0];
  }
  return -1;
}

bool is_bounds(const Header& header, const nc::Var& variable) {
  return std::ranges::any_of(header.vars, [&](const nc::Var& v) { return v.text("bounds") == variable.name; });
}

/// The first variable of times over stations and one other dimension, or over the samples.
const nc::Var* time_variable(const Header& header, const StationLayout& layout, int sample_dim) {
  for (const nc::Var& variable : header.vars) {
    if (!is_number(variable) || role_of(variable) != Role::time || is_bounds(header, variable)) continue;
    if (sample_dim >= 0 && variable.dims == std::vector{sample_dim}) return &variable;
    const auto others = std::ranges::count_if(variable.dims, [&](int d) { return d != layout.station_dim; });
    if (sample_dim < 0 && others == 1 && variable.dims.size() <= 2) return &variable;
  }
  return nullptr;
}

void read_counts(const nc::File& file, const Header& header, const nc::Var& counts, StationLayout& layout) {
  const auto rows = file.integers(counts);
  if (counts.dims != std::vector{layout.station_dim})
    throw bad(header, fmt::format("'{}' with sample_dimension has the shape {}; one count a station was expected",
                                  counts.name, header.shape_text(counts)));
  for (std::size_t s = 0; s < rows.size(); ++s) {
    const std::int64_t left = std::int64_t(layout.steps) - std::int64_t(layout.station_of.size());
    if (rows[s] < 0 || rows[s] > left)
      throw bad(header,
                fmt::format("'{}' counts {} samples at position {}; {} are left", counts.name, rows[s], s, left));
    layout.station_of.insert(layout.station_of.end(), std::size_t(rows[s]), s);
  }
  if (layout.station_of.size() != layout.steps)
    throw bad(header, fmt::format("'{}' counts {} samples; the dimension '{}' has {}", counts.name,
                                  layout.station_of.size(), layout.counted, layout.steps));
}

void read_indexes(const nc::File& file, const Header& header, const nc::Var& index, StationLayout& layout) {
  for (const std::int64_t station : file.integers(index)) {
    if (station < 0 || station >= std::int64_t(layout.stations))
      throw bad(header, fmt::format("'{}' names station {} at position {}; there are {}, counted from 0", index.name,
                                    station, layout.station_of.size(), layout.stations));
    layout.station_of.push_back(std::size_t(station));
  }
}

}  // namespace

const nc::Var* timeseries_id(const Header& header) {
  for (const nc::Var& variable : header.vars)
    if (variable.text("cf_role") == "timeseries_id") return &variable;
  return nullptr;
}

std::optional<Strides> StationLayout::strides(const Header& header, const nc::Var& variable) const {
  Strides out;
  std::size_t stride = 1;
  bool has_step = false, has_station = false;
  for (std::size_t i = variable.dims.size(); i-- > 0;) {
    const std::size_t length = header.dim(variable.dims[i]).length;
    if (variable.dims[i] == step_dim) {
      out.by_step = stride;
      has_step = true;
    } else if (variable.dims[i] == station_dim && station_of.empty()) {
      out.by_station = stride;
      has_station = true;
    } else if (length != 1) {
      return std::nullopt;
    }
    stride *= length;
  }
  const bool whole = has_step && (has_station || station_dim < 0 || !station_of.empty() || &variable == time);
  return whole ? std::optional(out) : std::nullopt;
}

void StationLayout::each(const std::function<void(std::size_t, std::size_t)>& visit) const {
  if (!station_of.empty()) {
    for (std::size_t i = 0; i < station_of.size(); ++i) visit(station_of[i], i);
    return;
  }
  for (std::size_t s = 0; s < stations; ++s)
    for (std::size_t t = 0; t < steps; ++t) visit(s, t);
}

StationLayout station_layout(const nc::File& file, const Header& header) {
  StationLayout layout;
  const std::string feature = lower(header.text("featureType"));
  if (!feature.empty() && feature != "timeseries")
    throw bad(header,
              fmt::format("featureType is '{}'; observations at stations need timeSeries", header.text("featureType")));
  layout.id = timeseries_id(header);
  if (layout.id == nullptr)
    throw bad(header, "no variable with cf_role = \"timeseries_id\"; expected one that tells the stations apart");
  layout.station_dim = station_dimension(header, *layout.id);
  if (layout.station_dim >= 0) layout.stations = header.dim(layout.station_dim).length;
  const nc::Var *counts = nullptr, *index = nullptr;
  int sample_dim = -1;
  for (const nc::Var& variable : header.vars) {
    if (const auto name = variable.text("sample_dimension"); !name.empty()) {
      counts = &variable;
      sample_dim = dim_named(header, name, variable);
    } else if (!variable.text("instance_dimension").empty()) {
      index = &variable;
      if (dim_named(header, variable.text("instance_dimension"), variable) != layout.station_dim ||
          variable.dims.size() != 1)
        throw bad(header, fmt::format("'{}' does not give one station of '{}' for each sample", variable.name,
                                      layout.id->name));
      sample_dim = variable.dims[0];
    }
  }
  layout.time = time_variable(header, layout, sample_dim);
  if (layout.time == nullptr)
    throw bad(header,
              "no time of the observations; expected a variable with units such as "
              "\"days since 1961-01-01\"");
  layout.step_dim = *std::ranges::find_if(layout.time->dims, [&](int d) { return d != layout.station_dim; });
  layout.steps = header.dim(layout.step_dim).length;
  layout.counted = header.dim(layout.step_dim).name;
  if (counts != nullptr) read_counts(file, header, *counts, layout);
  if (counts == nullptr && index != nullptr) read_indexes(file, header, *index, layout);
  return layout;
}

}  // namespace windrow::cf
