// Columns that are computed from a field's values before a map is applied: gradients, multipliers, vector components.
#pragma once
#include <cstdint>
#include <memory>
#include <span>
#include <vector>

namespace windrow::linear_map {

/// Computes some columns at one time step after another. Not for sharing between threads.
class Extender {
 public:
  virtual ~Extender() = default;
  /// Source cells whose values are needed, ascending.
  [[nodiscard]] virtual const std::vector<std::uint32_t>& needs() const = 0;
  /// `values`: one a needed cell, NaN where missing; `out`: one a column asked for: the value itself for a value column
  /// (NaN where missing), 0 for an increment of a missing cell. The same columns of the same values give the same bits
  /// whatever else was asked for.
  virtual void extend(std::span<const double> values, std::span<double> out) = 0;
};

class Extension {
 public:
  virtual ~Extension() = default;
  [[nodiscard]] virtual std::size_t cells() const = 0;    ///< value columns
  [[nodiscard]] virtual std::size_t columns() const = 0;  ///< all
  /// `columns` ascending.
  [[nodiscard]] virtual std::unique_ptr<Extender> extender(const std::vector<std::uint32_t>& columns) const = 0;
};

}  // namespace windrow::linear_map
