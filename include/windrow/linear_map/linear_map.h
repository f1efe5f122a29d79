// The one linear map: sparse rows of pairings. Knows no geometry and no file.
#pragma once
#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

namespace windrow::linear_map {

/// What the shares of a map stand for.
enum class Quantity : std::uint8_t {
  mean,  ///< share = overlap / row-cell area: a weighted mean, renormalised by what is present
  total  ///< share = overlap / column-cell area: a sum, never renormalised
};

/// rows x columns, compressed sparse rows. Pairings of a row stand in ascending column order.
/// The first `value_columns` columns are the source cells' values. What follows are increments: columns an Extension
/// computes from the values (gradients, multipliers); they add share * increment and carry no weight of their own.
/// Law: for Quantity::mean, shares are before normalising; over value columns their row sum is the cover of the cell
/// (`cover`'s, where given).
struct LinearMap {
  Quantity quantity = Quantity::mean;
  std::size_t columns = 0;        ///< all
  std::size_t value_columns = 0;  ///< of them, source cells
  std::vector<std::uint64_t> row_start;  ///< rows + 1
  std::vector<std::uint32_t> column;     ///< one a pairing
  std::vector<double> share;             ///< one a pairing
  std::vector<double> cover;             ///< one a pairing, or empty: where the geometric share is not the weight
  std::vector<double> factor;            ///< one a pairing, or empty: multiplies a value without being weight (vectors)
  std::vector<double> row_area;          ///< rows; steradians (empty for maps without areas, e.g. reach)
  std::vector<double> column_area;       ///< value_columns; steradians (may be empty)
  std::string provenance;                ///< one line: method, both ends
  [[nodiscard]] std::size_t rows() const { return row_start.empty() ? 0 : row_start.size() - 1; }
  [[nodiscard]] std::size_t pairings() const { return column.size(); }
  bool operator==(const LinearMap&) const = default;
};

/// Overlap area of every column (steradians), summed exactly over the rows: sum_i share_ij * row_area_i; for an
/// increment column the same sum of its shares.
std::vector<double> column_overlap(const LinearMap& map);

/// Serialised form for the workspace (little-endian, versioned, with a digest at the end) and back.
/// parse returns false when bytes are damaged or of another version.
std::vector<std::byte> serialise(const LinearMap& map);
bool parse(std::span<const std::byte> bytes, LinearMap& map);

}  // namespace windrow::linear_map
