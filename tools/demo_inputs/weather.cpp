// Random numbers by counter and autoregressive weather on nodes; what climate they belong to is not known here.
#include "weather.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>

namespace demo {
namespace {

// Region of the nodes: the models' grids with room for the spline all around.
constexpr double kWest = -50, kEast = -5, kSouth = 30, kNorth = 70;
constexpr int kPointsAcross = 4;

std::uint64_t mix(std::uint64_t z) {
  z += 0x9E3779B97F4A7C15ULL;
  z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9ULL;
  z = (z ^ (z >> 27)) * 0x94D049BB133111EBULL;
  return z ^ (z >> 31);
}

double sum_of_four(std::uint64_t bits) {
  const std::uint64_t sum = (bits & 0xFFFF) + (bits >> 16 & 0xFFFF) + (bits >> 32 & 0xFFFF) + (bits >> 48);
  return (static_cast<double>(sum) + 2.0) / 65536.0;
}

std::array<double, 4> spline(double t) {
  const double u = 1 - t;
  return {u * u * u / 6, (3 * t * t * t - 6 * t * t + 4) / 6, (3 * u * u * u - 6 * u * u + 4) / 6, t * t * t / 6};
}

}  // namespace

std::uint64_t draw(std::uint64_t seed, std::uint64_t a, std::uint64_t b) { return mix(mix(mix(seed) ^ a) ^ b); }

double uniform(std::uint64_t seed, std::uint64_t a, std::uint64_t b) {
  return static_cast<double>(draw(seed, a, b) >> 11) * 0x1.0p-53;
}

double normal(std::uint64_t seed, std::uint64_t a, std::uint64_t b) {
  const std::uint64_t bits = draw(seed, a, b);
  const double sum = sum_of_four(bits) + sum_of_four(mix(bits));
  return (sum - 4) * std::sqrt(1.5);  // eight uniforms have a variance of 8/12
}

double wave(double phase) {
  const double t = phase - std::floor(phase);  // 0 at the crest
  const double u = t < 0.5 ? t - 0.25 : 0.75 - t;
  return -8 * u * (1 - 2 * std::abs(u));
}

WeatherField::WeatherField(double node_spacing_deg, double memory, std::uint64_t seed)
    : spacing_(node_spacing_deg),
      memory_(memory),
      innovation_(std::sqrt(1 - memory * memory)),
      seed_(seed),
      columns_(static_cast<int>((kEast - kWest) / node_spacing_deg) + 1),
      rows_(static_cast<int>((kNorth - kSouth) / node_spacing_deg) + 1),
      state_(static_cast<std::size_t>(columns_) * rows_) {
  for (std::size_t node = 0; node < state_.size(); ++node) state_[node] = normal(seed_, node, day_);
}

void WeatherField::next_day() {
  ++day_;
  for (std::size_t node = 0; node < state_.size(); ++node) {
    state_[node] = memory_ * state_[node] + innovation_ * normal(seed_, node, day_);
  }
}

Share WeatherField::point(double lon, double lat) const {
  const double x = (lon - kWest) / spacing_, y = (lat - kSouth) / spacing_;
  const int column = static_cast<int>(x), row = static_cast<int>(y);
  const auto wx = spline(x - column), wy = spline(y - row);
  Share share;
  double squares = 0;
  for (int j = 0; j < 4; ++j) {
    for (int i = 0; i < 4; ++i) {
      share.node.push_back((row + j - 1) * columns_ + column + i - 1);
      share.weight.push_back(wx[i] * wy[j]);
      squares += share.weight.back() * share.weight.back();
    }
  }
  for (double& weight : share.weight) weight /= std::sqrt(squares);
  return share;
}

Share WeatherField::cell(double west, double south, double step) const {
  std::vector<double> weight(state_.size());
  for (int j = 0; j < kPointsAcross; ++j) {
    for (int i = 0; i < kPointsAcross; ++i) {
      const double part = step / kPointsAcross;
      const Share here = point(west + (i + 0.5) * part, south + (j + 0.5) * part);
      for (std::size_t k = 0; k < here.node.size(); ++k) {
        weight[here.node[k]] += here.weight[k] / (kPointsAcross * kPointsAcross);
      }
    }
  }
  Share share;
  for (std::size_t node = 0; node < weight.size(); ++node) {
    if (weight[node] == 0) continue;
    share.node.push_back(static_cast<int>(node));
    share.weight.push_back(weight[node]);
  }
  return share;
}

double WeatherField::value(const Share& share) const {
  double sum = 0;
  for (std::size_t k = 0; k < share.node.size(); ++k) sum += share.weight[k] * state_[share.node[k]];
  return sum;
}

}  // namespace demo
