// Reading CF NetCDF: what a run's files hold, and windows of their values. Hides netCDF and HDF5 completely.
// Every netCDF and HDF5 call is made under one process-wide mutex (library_mutex()).
#pragma once
#include <array>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <mutex>
#include <optional>
#include <string>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/base/notices.h"
#include "windrow/calendar/calendar.h"
#include "windrow/mesh/cell_records.h"
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

enum class GridKind : std::uint8_t {
  latlon,     ///< `edges`
  rotated,    ///< `edges` in the frame of `rotation`
  projected,  ///< `x_edges`, `y_edges` in `axis_units` of the CRS that `mapping` describes
  cells,      ///< `corners`, `sides`: curvilinear, listed with vertices, reduced
  faces,      ///< `faces`: UGRID
  healpix,    ///< `healpix`
  points      ///< `points`: stations or an area mean without extent; no cells
};

/// A horizontal grid as recognised: plain records from which a mesh is made. Only what the kind names is filled.
struct Grid {
  GridKind kind = GridKind::latlon;
  mesh::LatLonEdges edges;              ///< ascending
  mesh::Rotation rotation;
  std::vector<double> x_edges, y_edges;  ///< ascending
  std::string axis_units;                ///< as the file (or the job's hint) says: "m", "km", "radian"
  std::string crs;                       ///< CRS the job's hint gives instead of a mapping
  std::vector<Attribute> mapping;        ///< attributes of the grid mapping variable, crs_wkt among them; may be empty
  mesh::CellCorners corners;
  mesh::Sides sides = mesh::Sides::great_circles;
  mesh::FaceNodes faces;
  std::vector<mesh::HealpixCell> healpix;
  std::vector<GeoPoint> points;
  std::vector<std::uint32_t> subset;  ///< the data have only these cells of the grid above, in this order; empty: all
  std::string how;  ///< one line: "Gaussian N48, edges from quadrature weights (no bounds in the file)"
  std::string why;  ///< one line: what in the metadata decided: "coordinate variables 'lat' (degrees_north), ..."
  bool gaussian = false;
};

/// What a job says about a run's grid where its files do not.
struct GridHints {
  std::string crs;                            ///< of projected axes without a grid mapping
  std::optional<std::array<double, 2>> pole;  ///< longitude, latitude of a rotated grid's north pole
  std::string axis_units;                     ///< of projected axes without units
  std::string coordinates;                    ///< another file that holds the coordinates (and bounds)
  std::string sides;                          ///< "great-circles" or "parallels"
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
/// understood is Error(data): variable missing (near miss named), a grid that cannot be recognised or cells that cannot
/// be inferred (naming the key of the job's `grid = {...}` that would settle it), axis not monotonic, unknown calendar or
/// units, truncated file (size against header), files on different grids.
std::unique_ptr<RunVariable> open_run(const std::vector<std::string>& paths, const std::string& variable,
                                      Notices& notices, const GridHints& hints = {});

/// What a file holds, for `inspect`: the names of its data variables (not coordinates, bounds, grid mappings).
std::vector<std::string> data_variables(const std::string& path);
/// True for a file that starts with a netCDF classic, 64-bit or HDF5 signature.
bool looks_like_netcdf(const std::string& path);

}  // namespace windrow::cf
