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
/// Law: for Quantity::mean, shares are before normalising; their row sum is the geometric cover of the cell.
struct LinearMap {
  Quantity quantity = Quantity::mean;
  std::size_t columns = 0;
  std::vector<std::uint64_t> row_start;  ///< rows + 1
  std::vector<std::uint32_t> column;     ///< one a pairing
  std::vector<double> share;             ///< one a pairing
  std::vector<double> row_area;          ///< rows; steradians (empty for maps without areas, e.g. reach)
  std::vector<double> column_area;       ///< columns; steradians (may be empty)
  std::string provenance;                ///< one line: method, both ends
  [[nodiscard]] std::size_t rows() const { return row_start.empty() ? 0 : row_start.size() - 1; }
  [[nodiscard]] std::size_t pairings() const { return column.size(); }
  bool operator==(const LinearMap&) const = default;
};

/// Overlap area of every column (steradians), summed exactly over the rows: sum_i share_ij * row_area_i.
std::vector<double> column_overlap(const LinearMap& map);

/// Serialised form for the workspace (little-endian, versioned, with a digest at the end) and back.
/// parse returns false when bytes are damaged or of another version.
std::vector<std::byte> serialise(const LinearMap& map);
bool parse(std::span<const std::byte> bytes, LinearMap& map);

}  // namespace windrow::linear_map
