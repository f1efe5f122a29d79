// Reading windows of members' products and computing chunks of a stage. Private to the engine.
#pragma once
#include <list>
#include <memory>
#include <mutex>
#include <string>
#include <utility>
#include <vector>

#include "ensemble_make.h"

namespace windrow::engine {

/// A rectangle of mesh cells, one chunk wide.
struct CellBlock {
  std::size_t y0 = 0, y1 = 0, x0 = 0, x1 = 0;
  [[nodiscard]] std::size_t cells() const { return (y1 - y0) * (x1 - x0); }
};
CellBlock cell_block(const Target& target, const plan::Chunk& chunk, std::size_t index);
std::size_t cell_blocks(const Target& target, const plan::Chunk& chunk);

/// Open products, the least recently used closed first. Thread-safe.
class ProductPool {
 public:
  std::shared_ptr<cf::ProductReader> open(const std::string& path);

 private:
  std::mutex mutex_;
  std::list<std::pair<std::string, std::shared_ptr<cf::ProductReader>>> open_;
};

/// Values of a stage's members. Thread-safe.
class MemberReader {
 public:
  MemberReader(const EnsembleStage& stage, const MemberText& text, bool rows)
      : stage_(stage), text_(text), rows_(rows) {}
  /// out[i * cells + cell] at places steps[i] of the member's axis, ascending; NaN where missing.
  void read(std::size_t member, const CellBlock& block, std::span<const std::size_t> steps, std::vector<float>& out);

 private:
  const EnsembleStage& stage_;
  const MemberText& text_;
  bool rows_;  ///< products have two horizontal dimensions
  ProductPool pool_;
};

/// Monthly means of the stage's period of its only member: [(month - 1) * cells + cell]. Steps are read a chunk at a
/// time.
std::vector<double> monthly_means(const EnsembleStage& stage, MemberReader& reader, const CellBlock& block,
                                  std::size_t steps_at_once);

/// Value of one output from the members' values at one cell and step; reorders them. `month` 0..11, `climatology` of
/// the cell's block as above, for anomalies.
double ensemble_value(const EnsembleStage& stage, std::size_t output, std::span<double> members, double scale);

}  // namespace windrow::engine
