// The mass-preserving smooth map and the extension that computes its multipliers.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "restore.h"
#include "sweeps.h"
#include "windrow/base/error.h"
#include "windrow/overlap/methods.h"

namespace windrow::overlap {
namespace {

using linear_map::LinearMap;

// Value pairings: smoothed shares times the mesh cell's cover, and beside them the geometric share. Increments: that
// share again. So a mesh value is smooth + sum over overlaps of share * multiplier, and the change it makes is the
// least one in the mean square over area (the shares are overlap areas divided by the mesh cell's own area).
LinearMap smooth_map(LinearMap plain, const SmoothShares& smooth, const std::string& ends) {
  LinearMap map;
  map.columns = 2 * plain.value_columns;
  map.value_columns = plain.value_columns;
  map.provenance =
      fmt::format("conservative, smooth: {} sweeps of neighbour means, integrals restored; {}", smooth.sweeps, ends);
  const std::size_t pairings = smooth.column.size() + plain.pairings();
  map.column.reserve(pairings);
  map.share.reserve(pairings);
  map.cover.reserve(pairings);
  map.row_start.reserve(plain.row_start.size());
  map.row_start.push_back(0);
  for (std::size_t row = 0; row < plain.rows(); ++row) {
    const auto first = plain.row_start[row], last = plain.row_start[row + 1];
    double cover = 0;
    for (auto p = first; p < last; ++p) cover += plain.share[p];
    auto p = first;  // both lists ascend, and every overlap is among the smooth shares
    for (auto w = smooth.start[row]; w < smooth.start[row + 1]; ++w) {
      const bool overlaps = p < last && plain.column[p] == smooth.column[w];
      map.column.push_back(smooth.column[w]);
      map.share.push_back(cover * smooth.share[w]);
      map.cover.push_back(overlaps ? plain.share[p++] : 0.0);
    }
    for (p = first; p < last; ++p) {
      map.column.push_back(static_cast<std::uint32_t>(plain.value_columns + plain.column[p]));
      map.share.push_back(plain.share[p]);
      map.cover.push_back(0);
    }
    map.row_start.push_back(map.column.size());
  }
  map.row_area = std::move(plain.row_area);
  map.column_area = std::move(plain.column_area);
  return map;
}

class MultiplierExtender final : public linear_map::Extender {
 public:
  MultiplierExtender(std::shared_ptr<const SmoothSystem> shared, bool non_negative,
                     const std::vector<std::uint32_t>& columns)
      : shared_(std::move(shared)),
        system_(*shared_),
        non_negative_(non_negative),
        columns_(columns),
        value_(system_.cells, std::nan("")) {
    std::vector<std::uint8_t> needed(system_.cells, 0);
    for (const std::uint32_t column : columns) {
      if (column < system_.cells) {
        needed[column] = 1;
      } else {
        solves_ = true;
      }
    }
    if (solves_) {
      for (const std::uint32_t cell : system_.used) needed[cell] = 1;
    }
    for (std::uint32_t k = 0; k < system_.cells; ++k) {
      if (needed[k]) needs_.push_back(k);
    }
  }

  const std::vector<std::uint32_t>& needs() const override { return needs_; }

  void extend(std::span<const double> values, std::span<double> out) override {
    for (std::size_t k = 0; k < needs_.size(); ++k) value_[needs_[k]] = values[k];
    if (solves_) find_multipliers();
    for (std::size_t k = 0; k < columns_.size(); ++k) {
      if (columns_[k] < system_.cells) {
        out[k] = value_[columns_[k]];
        continue;
      }
      const std::uint32_t group = equations_->group()[columns_[k] - system_.cells];
      out[k] = group == Equations::kNone ? 0.0 : multiplier_[group];
    }
  }

 private:
  void find_multipliers() {
    std::vector<std::uint8_t> missing(system_.cells, 1);
    for (const std::uint32_t k : system_.used) missing[k] = std::isnan(value_[k]) ? 1 : 0;
    if (equations_ == nullptr || missing != missing_) {  // the equations of one pattern are the same whenever it comes
      missing_ = std::move(missing);
      positive_.reset();
      equations_ = std::make_unique<Equations>(system_, missing_);
      if (non_negative_) positive_ = std::make_unique<NonNegative>(system_, *equations_, missing_);
    }
    const bool solved =
        non_negative_ ? positive_->restore(value_, multiplier_) : restore(*equations_, value_, multiplier_);
    if (!solved) {
      throw Error(Failure::defect, "conservative-smooth",
                  "the integrals of the source cells could not be restored to 1e-10 of their terms");
    }
  }

  std::shared_ptr<const SmoothSystem> shared_;
  const SmoothSystem& system_;
  bool non_negative_;
  bool solves_ = false;
  std::vector<std::uint32_t> columns_, needs_;
  std::vector<double> value_, multiplier_;
  std::vector<std::uint8_t> missing_;
  std::unique_ptr<Equations> equations_;
  std::unique_ptr<NonNegative> positive_;
};

class Multipliers final : public linear_map::Extension {
 public:
  Multipliers(const LinearMap& map, bool non_negative)
      : system_(std::make_shared<const SmoothSystem>(map)), non_negative_(non_negative) {}
  std::size_t cells() const override { return system_->cells; }
  std::size_t columns() const override { return 2 * system_->cells; }
  std::unique_ptr<linear_map::Extender> extender(const std::vector<std::uint32_t>& columns) const override {
    return std::make_unique<MultiplierExtender>(system_, non_negative_, columns);
  }

 private:
  std::shared_ptr<const SmoothSystem> system_;
  bool non_negative_;
};

}  // namespace

std::unique_ptr<linear_map::Extension> make_multipliers(const LinearMap& map, bool non_negative) {
  return std::make_unique<Multipliers>(map, non_negative);
}

Smooth conservative_smooth(const mesh::Mesh& source, const mesh::Mesh& target, bool non_negative) {
  Result plain = conservative(source, target, linear_map::Quantity::mean);
  const SmoothShares smooth = smoothed_shares(plain.map, target);
  Smooth out;
  out.closure = plain.closure;
  out.map =
      smooth_map(std::move(plain.map), smooth, fmt::format("from {}; to {}", source.describe(), target.describe()));
  out.extension = make_multipliers(out.map, non_negative);
  return out;
}

}  // namespace windrow::overlap
