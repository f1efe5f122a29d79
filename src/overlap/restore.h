// Equations that restore every source cell's integral after smoothing, for one pattern of missing source cells.
#pragma once
#include <span>
#include <vector>

#include "symmetric.h"
#include "windrow/linear_map/linear_map.h"

namespace windrow::overlap {

/// What a smooth map says about its two sides, in the order of its rows. Made once.
struct SmoothSystem {
  explicit SmoothSystem(const linear_map::LinearMap& map);
  std::size_t cells = 0;            ///< source cells
  std::vector<std::uint32_t> used;  ///< source cells that appear in the map
  std::vector<double> row_area;
  std::vector<std::uint64_t> weight_start;  ///< smooth shares of each mesh cell
  std::vector<std::uint32_t> weight_column;
  std::vector<double> weight;
  std::vector<std::uint64_t> overlap_start;  ///< overlaps of each mesh cell
  std::vector<std::uint32_t> overlap_column;
  std::vector<double> overlap;  ///< share of the mesh cell's area
  std::vector<double> area;     ///< one a source cell: its part in the mesh
  SymmetricMatrix shared;       ///< sum over mesh cells of overlap area * overlap share, source cells x source cells
};

/// One source cell's smoothed integral as weights of source values.
struct Mixed {
  std::uint32_t cell;
  double area;
};

/// Equations for the source cells that have a value. A source cell without a mesh cell of its own (one that no other
/// present cell overlaps) cannot always be restored by itself: it is restored together with the cell it shares most
/// with, and so on until each group has a mesh cell of its own. So the equations always have one solution, and one that
/// is nowhere negative when the values are not.
class Equations {
 public:
  /// `missing`: one a source cell.
  Equations(const SmoothSystem& system, const std::vector<std::uint8_t>& missing);
  [[nodiscard]] std::size_t groups() const { return matrix_.rows(); }
  static constexpr std::uint32_t kNone = 0xffffffffU;
  /// Group of each source cell, kNone where missing or outside the mesh.
  [[nodiscard]] const std::vector<std::uint32_t>& group() const { return group_; }
  [[nodiscard]] const SymmetricMatrix& matrix() const { return matrix_; }
  /// By how much each group's integral is off after smoothing, and the size of the terms that it is a difference of.
  void residual(std::span<const double> value, std::vector<double>& off, std::vector<double>& size) const;

 private:
  void make_groups(const std::vector<std::uint8_t>& missing);
  void mix(const std::vector<std::uint8_t>& missing);
  const SmoothSystem& system_;
  std::vector<std::uint32_t> group_;
  SymmetricMatrix matrix_;
  std::vector<std::uint64_t> mixed_start_;  // one a source cell
  std::vector<Mixed> mixed_;
};

/// Accuracy asked of every integral: of the terms it is made of, and of the field's largest value.
inline constexpr double kRestored = 1e-13, kRestoredOfField = 1e-17;
/// Turns sizes of terms into tolerances of the equations.
void to_tolerance(const SymmetricMatrix& matrix, std::span<const double> value, std::vector<double>& size);

/// Multipliers (one a group) that restore integrals by the least change of mesh values, weighted by area. False when
/// the system is not solved.
bool restore(const Equations& equations, std::span<const double> value, std::vector<double>& multiplier);

/// The same under the condition that no mesh value is below zero. Groups whose integral is not above zero become zero
/// everywhere they reach. For one pattern of missing cells; working memory is kept.
class NonNegative {
 public:
  NonNegative(const SmoothSystem& system, const Equations& equations, const std::vector<std::uint8_t>& missing);
  bool restore(std::span<const double> value, std::vector<double>& multiplier);

 private:
  struct Part {
    std::uint32_t group;
    double share, area;
  };
  void smooth(std::span<const double> value);
  double evaluate(const std::vector<double>& multiplier, bool with_matrix);
  void silence(std::vector<double>& multiplier) const;

  const SmoothSystem& system_;
  const Equations& equations_;
  std::vector<std::uint8_t> missing_;
  std::vector<std::uint32_t> row_;  // mesh cells with a present overlap
  std::vector<std::uint64_t> part_start_;
  std::vector<Part> part_;
  std::vector<double> smooth_, wanted_, off_, size_;
  std::vector<std::uint8_t> silent_group_, silent_row_;
  SymmetricMatrix active_;
};

}  // namespace windrow::overlap
