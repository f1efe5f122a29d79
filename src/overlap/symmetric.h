// Sparse symmetric positive systems, small enough for conjugate gradients. No geometry.
#pragma once
#include <cstdint>
#include <vector>

namespace windrow::overlap {

/// Compressed rows, columns ascending; every row has its diagonal.
struct SymmetricMatrix {
  std::vector<std::uint64_t> start;
  std::vector<std::uint32_t> column;
  std::vector<std::uint64_t> diagonal;  ///< place of each row's own entry
  std::vector<double> value;
  [[nodiscard]] std::size_t rows() const { return diagonal.size(); }
  [[nodiscard]] double diagonal_of(std::size_t row) const { return value[diagonal[row]]; }
  /// Place of an entry that exists.
  [[nodiscard]] std::uint64_t place(std::uint32_t row, std::uint32_t col) const;
  void multiply(const std::vector<double>& x, std::vector<double>& out) const;
};

/// One entry on its way into a matrix; entries of one place are added in the order given.
struct MatrixEntry {
  std::uint32_t row, column;
  double value;
};
/// Entries of both triangles; diagonals that no entry names become zero.
SymmetricMatrix make_matrix(std::size_t rows, std::vector<MatrixEntry> entries);

/// Is every entry at most its tolerance in size? (A NaN is not.)
bool within(const std::vector<double>& residual, const std::vector<double>& tolerance);

/// Solves for x, which starts at zero, by conjugate gradients scaled by the diagonal (Hestenes & Stiefel 1952, J. Res.
/// NBS 49, 409), started again from the true residual while that is above `tolerance` (one a row). False when it stays
/// above. In one fixed order: the same system gives the same bits.
bool solve(const SymmetricMatrix& matrix, const std::vector<double>& right, const std::vector<double>& tolerance,
           std::vector<double>& x);

}  // namespace windrow::overlap
