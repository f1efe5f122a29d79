// Where a value stands among the nodes of a distribution. Shared by fitting (mean weights) and evaluation (ranks), so
// that the reset of the calibration mean sees the very weights of the evaluation.
#pragma once
#include <cstddef>
#include <cstdint>
#include <span>
#include <vector>

namespace windrow::adjust {

/// tau of node k of n.
inline double node_tau(std::size_t k, std::size_t n) { return (static_cast<double>(k) + 0.5) / static_cast<double>(n); }

/// Pair of nodes about tau and the upper one's weight; the outermost node beyond its own tau.
struct Between {
  std::size_t node;
  double weight;
};
inline Between between_nodes(double tau, std::size_t n) {
  const double at = tau * static_cast<double>(n) - 0.5;
  if (!(at > 0)) return {0, 0};
  if (at >= static_cast<double>(n - 1)) return {n - 2, 1};
  const auto node = static_cast<std::size_t>(at);
  return {node, at - static_cast<double>(node)};
}
inline double at_tau(std::span<const double> nodes, double tau) {
  const Between b = between_nodes(tau, nodes.size());
  return nodes[b.node] + b.weight * (nodes[b.node + 1] - nodes[b.node]);
}

struct Standing {
  std::uint16_t node = 0;
  float weight = 0;
};

/// One season's nodes (2 or more, non-decreasing) with the middle of every run of equal nodes.
class NodeRow {
 public:
  void set(std::span<const double> nodes) {
    nodes_ = nodes;
    const std::size_t n = nodes.size();
    tie_.resize(n);
    for (std::size_t first = 0; first < n;) {
      std::size_t last = first;
      while (last + 1 < n && nodes[last + 1] == nodes[first]) ++last;
      // The middle of the run in half nodes; the last node of all is the upper end of the last pair.
      const std::size_t twice = first + last;
      Standing middle{static_cast<std::uint16_t>(twice / 2), twice % 2 == 0 ? 0.0F : 0.5F};
      if (middle.node + std::size_t{1} == n) middle = {static_cast<std::uint16_t>(n - 2), 1.0F};
      for (std::size_t i = first; i <= last; ++i) tie_[i] = middle;
      first = last + 1;
    }
  }

  /// Number of nodes <= x; branchless, for values in any order.
  [[nodiscard]] std::size_t count_below(double x) const {
    const double* base = nodes_.data();
    for (std::size_t length = nodes_.size(); length > 1;) {
      const std::size_t half = length / 2;
      base += half * static_cast<std::size_t>(base[half - 1] <= x);  // a product, so that no branch is guessed wrong
      length -= half;
    }
    return static_cast<std::size_t>(base - nodes_.data()) + (*base <= x ? 1 : 0);
  }

  /// `below`: count_below(x). Beyond the outermost nodes: the outermost node itself.
  [[nodiscard]] Standing standing(double x, std::size_t below) const {
    if (below == 0) return {};
    const double lower = nodes_[below - 1];
    if (lower == x) return tie_[below - 1];
    if (below == nodes_.size()) return {static_cast<std::uint16_t>(below - 2), 1.0F};
    return {static_cast<std::uint16_t>(below - 1), static_cast<float>((x - lower) / (nodes_[below] - lower))};
  }

  /// The same with the weight in full precision.
  [[nodiscard]] Between between(double x) const {
    const std::size_t below = count_below(x);
    const Standing place = standing(x, below);
    Between out{place.node, static_cast<double>(place.weight)};
    if (below > 0 && below < nodes_.size() && nodes_[below - 1] != x) {
      out.weight = (x - nodes_[below - 1]) / (nodes_[below] - nodes_[below - 1]);
    }
    return out;
  }

  [[nodiscard]] std::span<const double> nodes() const { return nodes_; }

 private:
  std::span<const double> nodes_;
  std::vector<Standing> tie_;
};

}  // namespace windrow::adjust
