// One file's time axis, decoded; and what a joined axis means: its frequency and the cells of steps without bounds.
#pragma once
#include <vector>

#include "header.h"
#include "windrow/calendar/calendar.h"
#include "windrow/cf/dataset.h"

namespace windrow::cf {

struct FileTime {
  calendar::Calendar calendar;
  std::vector<TimeStep> steps;  ///< strictly ascending
  bool bounds = false;          ///< begin and end come from the file
};

/// Decodes units, calendar (also user-defined ones), values and bounds. Times within 0.05 s of a whole second are that
/// second (decimal days). Error(data) for climatological axes, undecodable or non-ascending times, missing times.
FileTime read_time(const nc::File& file, const Header& header, const nc::Var& coordinate, Remarks& remarks);

/// The whole second, when the instant is within 0.05 s of one (decimal days).
calendar::Instant snapped(calendar::Instant instant);

/// Daily or monthly when the cells (with bounds) or the spacing of times (without) say so; gaps do not matter.
Frequency frequency_of(const calendar::Calendar& calendar, const std::vector<TimeStep>& steps, bool bounds);

/// Gives cells to steps without bounds: the day or calendar month that contains the time; else half-way to the
/// neighbours. A single step of neither kind keeps begin = end = time.
void infer_cells(const calendar::Calendar& calendar, Frequency frequency, std::vector<TimeStep>& steps);

/// Sentences about steps that are missing between neighbours; at most five, then a count.
std::vector<std::string> gap_remarks(const calendar::Calendar& calendar, Frequency frequency,
                                     const std::vector<TimeStep>& steps);

}  // namespace windrow::cf
