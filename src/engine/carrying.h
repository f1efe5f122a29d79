// From fitted stations to what is carried to places: values in a row, height drift, variogram, reach maps. The places
// are a job's mesh cells, or stations left out of the fit. Private to the engine.
#pragma once
#include <span>
#include <vector>

#include "placed.h"
#include "windrow/base/notices.h"
#include "windrow/job/spec.h"
#include "windrow/pipeline/stage.h"

namespace windrow::engine {

/// What stations hand on. Levels [station * seasons], shapes [station with a shape * seasons * width]: targets or
/// corrections.
struct Carried {
  reach::ReachMap level, shape;  ///< rows are the places; shape where the setup's width is not 0
  reach::Drift drift;            ///< kriging-height: taken off station_level, added at the places
  std::vector<double> station_level, station_shape;
  std::vector<double> mean_correction_level, mean_correction_shape;
  std::size_t level_stations = 0, shape_stations = 0;
};

/// `fitted`: at least one, all with a level. Noise, drift and variogram are learnt from these stations alone; without a
/// shape among them the shape's rows are empty.
Carried carry_over(const job::JobSpec& job, const job::FieldSpec& field, const adjust::Setup& setup,
                   const std::vector<const Fitted*>& fitted, const std::vector<GeoPoint>& places, Notices& notices);

/// Shows the pipeline what is carried; `carried` must outlive `adjust`. `height`: metres, of every place, looked at
/// with a drift only.
void hand_over(const Carried& carried, std::span<const double> height, pipeline::AdjustInput& adjust);

}  // namespace windrow::engine
