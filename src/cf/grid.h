// The horizontal grid of one variable in one file, with the way from mesh cells to array positions. One recogniser asks
// the kinds in turn; each kind lives in a file of its own (grid_*.cpp).
#pragma once
#include <cstddef>
#include <cstdint>
#include <optional>
#include <string>
#include <vector>

#include "axes.h"
#include "axis_cells.h"
#include "windrow/cf/dataset.h"

namespace windrow::cf {

/// Array positions of mesh cells, along at most two dimensions: rows x columns, or (`listed`) any list of positions
/// y * width + x.
struct Places {
  std::vector<std::size_t> rows, columns;
  std::vector<std::uint32_t> listed;
  std::size_t width = 1;

  [[nodiscard]] std::size_t size() const { return listed.empty() ? rows.size() * columns.size() : listed.size(); }
  [[nodiscard]] std::size_t y(std::size_t cell) const {
    return listed.empty() ? rows[cell / columns.size()] : listed[cell] / width;
  }
  [[nodiscard]] std::size_t x(std::size_t cell) const {
    return listed.empty() ? columns[cell % columns.size()] : listed[cell] % width;
  }
  bool operator==(const Places&) const = default;
  /// All positions in order; no columns: one dimension.
  static Places all(std::size_t rows, std::size_t columns = 1);
};

struct FileGrid {
  Grid grid;
  std::vector<int> dims;  ///< ids of the dimensions the places count along: {y, x}, {cell} or none
  Places places;
};

/// Every find_* reads coordinates and bounds when the metadata speak for its kind, and gives nothing otherwise. Error(data)
/// when they do, but the cells cannot be made. See axis_cells.h for what is repaired on axes.
std::optional<FileGrid> find_ugrid(const Context& context);
std::optional<FileGrid> find_healpix(const Context& context);
std::optional<FileGrid> find_gathered(const Context& context);
std::optional<FileGrid> find_latlon(const Context& context);
std::optional<FileGrid> find_rotated(const Context& context);
std::optional<FileGrid> find_projected(const Context& context);
std::optional<FileGrid> find_curvilinear(const Context& context);
std::optional<FileGrid> find_listed(const Context& context);  ///< cells with vertices, or rows of a reduced grid
std::optional<FileGrid> find_points(const Context& context);

/// Asks all of them. Error(data) when none knows the grid.
FileGrid recognise_grid(const Context& context);
/// The kinds that a gathered dimension can stand for; nothing when none fits.
std::optional<FileGrid> find_structured(const Context& context);

/// The axis with its bounds: those `bounds` names, or the n + 1 values `edges` names.
AxisValues read_axis(const Context& context, const nc::Var& coordinate);
/// Number of latitudes, pole to pole, of the Gaussian grid these rows belong to; 0 when they belong to none. `first`
/// becomes the row (from the south) of the lowest one.
std::size_t gaussian_rows(const AxisCells& cells, std::size_t& first);
/// Gives rows without bounds the edges of the quadrature weights, where they are Gaussian; returns gaussian_rows().
std::size_t use_quadrature_edges(AxisCells& latitudes, Remarks& remarks);
/// "edges from the file's bounds" and its variants.
std::string edges_text(const AxisCells& y, const AxisCells& x, bool weights, const char* y_name = "latitude",
                       const char* x_name = "longitude");

/// "'lat' (degrees_north)": what in a coordinate variable decided.
std::string evidence(const nc::Var& variable);
/// "with the grid mapping 'crs' (lambert_conformal_conic)", or that there is none.
std::string mapping_text(const Mapping& mapping);
std::vector<Attribute> mapping_records(const Mapping& mapping);

}  // namespace windrow::cf
