// Conjugate gradients and the matrix they work on.
#include "symmetric.h"

#include <algorithm>
#include <cmath>

namespace windrow::overlap {
namespace {

double product(const std::vector<double>& a, const std::vector<double>& b) {
  double sum = 0;
  for (std::size_t k = 0; k < a.size(); ++k) sum += a[k] * b[k];
  return sum;
}

}  // namespace

bool within(const std::vector<double>& residual, const std::vector<double>& tolerance) {
  for (std::size_t k = 0; k < residual.size(); ++k) {
    if (!(std::abs(residual[k]) <= tolerance[k])) return false;
  }
  return true;
}

std::uint64_t SymmetricMatrix::place(std::uint32_t row, std::uint32_t col) const {
  const auto first = column.begin() + static_cast<std::ptrdiff_t>(start[row]);
  const auto last = column.begin() + static_cast<std::ptrdiff_t>(start[row + 1]);
  return static_cast<std::uint64_t>(std::lower_bound(first, last, col) - column.begin());
}

void SymmetricMatrix::multiply(const std::vector<double>& x, std::vector<double>& out) const {
  for (std::size_t row = 0; row < rows(); ++row) {
    double sum = 0;
    for (auto k = start[row]; k < start[row + 1]; ++k) sum += value[k] * x[column[k]];
    out[row] = sum;
  }
}

SymmetricMatrix make_matrix(std::size_t rows, std::vector<MatrixEntry> entries) {
  for (std::size_t k = 0; k < rows; ++k) {
    entries.push_back({static_cast<std::uint32_t>(k), static_cast<std::uint32_t>(k), 0.0});
  }
  std::stable_sort(entries.begin(), entries.end(), [](const MatrixEntry& a, const MatrixEntry& b) {
    return a.row != b.row ? a.row < b.row : a.column < b.column;
  });
  SymmetricMatrix out;
  out.start.assign(rows + 1, 0);
  out.diagonal.resize(rows);
  for (std::size_t k = 0; k < entries.size();) {
    MatrixEntry sum = entries[k];
    for (++k; k < entries.size() && entries[k].row == sum.row && entries[k].column == sum.column; ++k) {
      sum.value += entries[k].value;
    }
    if (sum.row == sum.column) out.diagonal[sum.row] = out.value.size();
    out.column.push_back(sum.column);
    out.value.push_back(sum.value);
    out.start[sum.row + 1] = out.value.size();
  }
  return out;
}

bool solve(const SymmetricMatrix& matrix, const std::vector<double>& right, const std::vector<double>& tolerance,
           std::vector<double>& x) {
  const std::size_t rows = matrix.rows();
  constexpr int kRestarts = 6;
  const std::size_t most = 200 + 4 * rows;
  std::vector<double> residual = right, correction(rows), scaled(rows), direction(rows), image(rows);
  x.assign(rows, 0.0);
  for (int restart = 0; restart <= kRestarts; ++restart) {
    if (within(residual, tolerance)) return true;
    std::fill(correction.begin(), correction.end(), 0.0);
    double before = 0;
    for (std::size_t step = 0; step < most && !within(residual, tolerance); ++step) {
      for (std::size_t k = 0; k < rows; ++k) scaled[k] = residual[k] / matrix.diagonal_of(k);
      const double now = product(residual, scaled);
      if (!(now > 0)) break;
      const double ahead = step == 0 ? 0 : now / before;
      for (std::size_t k = 0; k < rows; ++k) direction[k] = scaled[k] + ahead * direction[k];
      matrix.multiply(direction, image);
      const double curvature = product(direction, image);
      if (!(curvature > 0)) break;
      const double length = now / curvature;
      for (std::size_t k = 0; k < rows; ++k) {
        correction[k] += length * direction[k];
        residual[k] -= length * image[k];
      }
      before = now;
    }
    for (std::size_t k = 0; k < rows; ++k) x[k] += correction[k];
    matrix.multiply(x, image);
    for (std::size_t k = 0; k < rows; ++k) residual[k] = right[k] - image[k];
  }
  return within(residual, tolerance);
}

}  // namespace windrow::overlap
