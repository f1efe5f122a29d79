// Helpers for files on any grid: fields in any order of dimensions, and everything a run holds. Invented data. Test
// only.
#pragma once
#include <algorithm>
#include <map>
#include <numeric>

#include "file_builder.h"
#include "sample_run.h"
#include "windrow/cf/dataset.h"

namespace windrow::cftest {

struct Length {
  std::string name;
  std::size_t count;
};
using Index = std::map<std::string, std::size_t>;

inline std::vector<std::string> names(const std::vector<Length>& dims) {
  std::vector<std::string> list;
  for (const Length& dim : dims) list.push_back(dim.name);
  return list;
}

/// value(index) at every place of an array with these dimensions, the last one fastest.
inline std::vector<double> fill(const std::vector<Length>& dims, const std::function<double(const Index&)>& value) {
  std::vector<double> list;
  std::size_t total = 1;
  for (const Length& dim : dims) total *= dim.count;
  for (std::size_t n = 0; n < total; ++n) {
    Index index;
    std::size_t rest = n;
    for (std::size_t k = dims.size(); k-- > 0;) {
      index[dims[k].name] = rest % dims[k].count;
      rest /= dims[k].count;
    }
    list.push_back(value(index));
  }
  return list;
}

inline FileBuilder& with_dims(FileBuilder& file, const std::vector<Length>& dims) {
  for (const Length& dim : dims) file.dim(dim.name, dim.count);
  return file;
}

/// All orders of some dimensions.
inline std::vector<std::vector<Length>> orders(std::vector<Length> dims) {
  std::vector<std::vector<Length>> list;
  std::ranges::sort(dims, {}, &Length::name);
  do list.push_back(dims);
  while (std::ranges::next_permutation(dims, {}, &Length::name).found);
  return list;
}

inline std::size_t cell_count(const cf::Grid& grid) {
  if (!grid.subset.empty()) return grid.subset.size();
  switch (grid.kind) {
    case cf::GridKind::projected:
      return (grid.x_edges.size() - 1) * (grid.y_edges.size() - 1);
    case cf::GridKind::cells:
      return grid.corners.ny * grid.corners.nx;
    case cf::GridKind::faces:
      return grid.faces.nodes.size() / grid.faces.most;
    case cf::GridKind::healpix:
      return grid.healpix.size();
    case cf::GridKind::points:
      return grid.points.size();
    default:
      return (grid.edges.lon_deg.size() - 1) * (grid.edges.lat_deg.size() - 1);
  }
}

/// All cells at all steps; one cell beyond must be a defect.
inline std::vector<double> read_cells(const cf::RunVariable& run) {
  std::vector<std::uint32_t> cells(cell_count(run.grid()));
  std::iota(cells.begin(), cells.end(), 0);
  std::vector<double> values(cells.size() * run.time().size());
  run.read(0, run.time().size(), cells, values.data());
  double beyond = 0;
  error_text(Failure::defect, [&] { run.read(0, 1, {std::uint32_t(cells.size())}, &beyond); });
  return values;
}

inline std::unique_ptr<cf::RunVariable> open(const std::string& path, Notices& notices,
                                             const cf::GridHints& hints = {}) {
  return cf::open_run({path}, "v", notices, hints);
}
/// Opens what needs no notice but that time has no bounds.
inline std::unique_ptr<cf::RunVariable> open(const std::string& path, const cf::GridHints& hints = {}) {
  Notices notices;
  auto run = cf::open_run({path}, "v", notices, hints);
  for (const Notice& notice : notices.list()) {
    INFO(notice.text);
    CHECK(notice.text.starts_with("time has no bounds"));
  }
  return run;
}
inline std::string refusal(const std::string& path, const cf::GridHints& hints = {}) {
  return error_text(Failure::data, [&] {
    Notices notices;
    cf::open_run({path}, "v", notices, hints);
  });
}

/// The time coordinate of `count` days.
inline FileBuilder& with_time(FileBuilder& file, std::size_t count) {
  file.var("time", NC_DOUBLE, {"time"}, steps(0.5, 1, count));
  file.att("units", "days since 2000-01-01").att("calendar", "standard");
  return file;
}

}  // namespace windrow::cftest
