// How the arrays of a file of stations are laid out: which element belongs to which station and time. CF 1.13, appendix
// H.2. Private to cf; the tables are made in stations.cpp.
#pragma once
#include <functional>
#include <optional>
#include <string>
#include <vector>

#include "header.h"

namespace windrow::cf {

/// Position of an element: station * by_station + step * by_step.
struct Strides {
  std::size_t by_station = 0, by_step = 0;
  [[nodiscard]] std::size_t at(std::size_t station, std::size_t step) const {
    return station * by_station + step * by_step;
  }
};

struct StationLayout {
  const nc::Var* id = nullptr;
  const nc::Var* time = nullptr;
  int station_dim = -1;  ///< -1: a single station without dimension
  int step_dim = -1;     ///< of time, or of the samples
  std::size_t stations = 1, steps = 0;
  std::vector<std::size_t> station_of;  ///< ragged: the station of each sample; else empty
  std::string counted;                  ///< name of the step dimension

  /// Where the elements of a variable stand; nullopt when its dimensions are not those of observations.
  [[nodiscard]] std::optional<Strides> strides(const Header& header, const nc::Var& variable) const;
  /// station and step of every element, station by station (ragged: as stored).
  void each(const std::function<void(std::size_t station, std::size_t step)>& visit) const;
};

/// Error(data) when there is no identifier or time, or when a ragged array's numbers do not add up.
StationLayout station_layout(const nc::File& file, const Header& header);

/// The variable with cf_role = "timeseries_id"; null when there is none.
const nc::Var* timeseries_id(const Header& header);

}  // namespace windrow::cf
