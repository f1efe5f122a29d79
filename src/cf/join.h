// Several files of one run as one time axis: sorted, overlaps taken once, gaps said.
#pragma once
#include <cstddef>
#include <string>
#include <vector>

#include "time_axis.h"
#include "windrow/base/notices.h"

namespace windrow::cf {

/// Steps [first, first + count) of the run are steps [file_first, ...) of file number `file`.
struct Span {
  std::size_t file = 0, file_first = 0, first = 0, count = 0;
};

struct JoinedTime {
  std::vector<TimeStep> steps;
  std::vector<Span> spans;  ///< ascending; a file appears twice when another lies inside it
};

/// Identical time stamps are taken from the file that starts later. Error(data) when files overlap but their stamps
/// differ there, since the same days would count twice.
JoinedTime join(const std::vector<std::string>& paths, const std::vector<FileTime>& times, Notices& notices);

}  // namespace windrow::cf
