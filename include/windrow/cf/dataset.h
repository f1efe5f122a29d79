// Reading CF NetCDF: what a run's files hold, and windows of their values. Hides netCDF and HDF5 completely.
// Every netCDF and HDF5 call is made under one process-wide mutex (library_mutex()).
#pragma once
#include <array>
#include <cstddef>
#include <memory>
#include <mutex>
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/notices.h"
#include "windrow/calendar/calendar.h"
#include "windrow/mesh/latlon_edges.h"

namespace windrow::cf {

std::mutex& library_mutex();
std::string library_version();  ///< "netCDF 4.9.0, HDF5 1.10.8"

struct Attribute {
  std::string name;
  std::string text;             ///< text attributes (also NC_STRING, joined by blanks)
  std::vector<double> numbers;  ///< numeric attributes
};

/// One time step. Bounds come from the file; without bounds they are inferred (daily: the day that contains the time;
/// monthly: the calendar month; else midpoints; a single step of neither kind has begin = end) and reported.
struct TimeStep {
  calendar::Instant time = 0, begin = 0, end = 0;
};
enum class Frequency { fixed, daily, monthly, other };

struct FileSpan {
  std::string path;
  std::size_t first = 0, count = 0;  ///< steps of the run's axis this file holds
};

/// A horizontal grid as recognised, with the way from mesh cells to array positions.
struct Grid {
  mesh::LatLonEdges edges;    ///< ascending
  std::string how;            ///< one line: "Gaussian N48, edges from quadrature weights (no bounds in the file)"
  bool gaussian = false;
};

struct VariableInfo {
  std::string name, standard_name, long_name, units, cell_methods;
  std::vector<Attribute> attributes;         ///< all of the variable's
  std::vector<Attribute> global_attributes;  ///< of the first file
};

/// A variable of one run: several files joined along time. Reading is thread-safe.
class RunVariable {
 public:
  virtual ~RunVariable() = default;
  [[nodiscard]] virtual const VariableInfo& info() const = 0;
  [[nodiscard]] virtual const Grid& grid() const = 0;
  [[nodiscard]] virtual const calendar::Calendar& calendar() const = 0;
  [[nodiscard]] virtual Frequency frequency() const = 0;
  [[nodiscard]] virtual const std::vector<TimeStep>& time() const = 0;  ///< one step with zeros when fixed
  [[nodiscard]] virtual const std::vector<FileSpan>& files() const = 0;
  [[nodiscard]] virtual bool double_precision() const = 0;  ///< values carry more than float32 does
  /// Values of `cells` (mesh cell numbers, ascending) for steps [t0, t1): out[(t - t0) * cells.size() + i], unpacked,
  /// in the file's units, NaN where missing. Reads in blocks of at most 64 MiB (or one chunk, where that is larger), in
  /// the file's chunk order, each chunk once. Error(io) names file and variable.
  virtual void read(std::size_t t0, std::size_t t1, const std::vector<std::uint32_t>& cells, double* out) const = 0;
  virtual void read(std::size_t t0, std::size_t t1, const std::vector<std::uint32_t>& cells, float* out) const = 0;
};

/// Opens `variable` in `paths` (already globbed) as one run. Files are sorted by their first time. Overlapping files:
/// identical time stamps are taken once from the file that starts later, and reported; a gap is reported.
/// Fixed fields (no time axis) need exactly one file. Odd but unambiguous metadata goes to `notices`; what cannot be
/// understood is Error(data): variable missing (near miss named), no latitude-longitude axes, axis not monotonic,
/// unknown calendar or units, truncated file (size against header), files on different grids.
std::unique_ptr<RunVariable> open_run(const std::vector<std::string>& paths, const std::string& variable,
                                      Notices& notices);

/// What a file holds, for `inspect`: the names of its data variables (not coordinates, bounds, grid mappings).
std::vector<std::string> data_variables(const std::string& path);
/// True for a file that starts with a netCDF classic, 64-bit or HDF5 signature.
bool looks_like_netcdf(const std::string& path);

}  // namespace windrow::cf
