// Geometry makes a map: overlap of every mesh cell with every source cell, as a LinearMap.
#pragma once
#include <cstdint>

#include "windrow/linear_map/linear_map.h"
#include "windrow/mesh/mesh.h"

namespace windrow::overlap {

/// How well the sums held *before* anything was normalised. Residuals are relative to the cell's own area.
struct Closure {
  double worst_row = 0;          ///< max over fully covered rows of |sum of shares - 1|
  double worst_row_bound = 0;    ///< the bound there: 1e-12 + 8 eps * perimeter / area
  double worst_column = 0;       ///< likewise over columns fully inside the mesh
  double worst_column_bound = 0;
  std::size_t rows_checked = 0, columns_checked = 0;
  bool holds = true;             ///< every checked residual within its own bound
};

struct Result {
  linear_map::LinearMap map;
  Closure closure;
};

/// How values reach the mesh. Job-file words; what each keeps is said in methods.h.
enum class Method : std::uint8_t { conservative_1, conservative_2, conservative_smooth, bilinear, nearest, majority };

/// First-order conservative map (piecewise constant; Jones 1999, MWR 127, 2204): rows = target cells, columns = source
/// cells. Runs on all OpenMP threads; the result does not depend on their number. Error(defect) when a covered cell's
/// residual exceeds its bound tenfold.
Result conservative(const mesh::Mesh& source, const mesh::Mesh& target, linear_map::Quantity quantity);

/// Shares and first moments of the overlaps, for a linear reconstruction within source cells: columns are [values | first
/// tangent component | second]; the increments' shares are integrals of the distance from the source cell's true area
/// centroid over the overlap, relative to the row's area (of a total: to the column's). The components are those of
/// `Gradient`. Column sums of the increments' moments over a source cell wholly covered are zero.
Result conservative_linear(const mesh::Mesh& source, const mesh::Mesh& target, linear_map::Quantity quantity);

/// One row a point, share 1 to the source cell that contains it; no pairing for a point outside.
linear_map::LinearMap containing(const mesh::Mesh& source, const std::vector<GeoPoint>& points);

}  // namespace windrow::overlap
