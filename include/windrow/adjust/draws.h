// A smooth random field over the globe, another one each day: which dry days are made wet, and in what order. The same
// for all runs of a family and for every calendar's like-named day, so that contrasts stay clean and rain unspeckled.
#pragma once
#include <array>
#include <cstdint>
#include <vector>

#include "windrow/base/angle.h"
#include "windrow/calendar/calendar.h"

namespace windrow::adjust {

/// A sum of kWaves plane waves through space, cut by the sphere: cos(k . r + phi), k of random direction and of lengths
/// about 2 pi / 1500 km .. 2 pi / 300 km, phi anew each day. Wave vectors follow from `seed`, phases from the seed and
/// the day's year, month and day, by counting (SplitMix64, Steele et al. 2014, from memory): no state, no order.
inline constexpr std::size_t kWaves = 24;

/// Phases of the days of one time axis.
class Draws {
 public:
  Draws(std::uint64_t seed, const std::vector<calendar::Date>& dates);
  using Pair = std::array<double, 2>;
  [[nodiscard]] const std::vector<Pair>& phases() const { return phase_; }  ///< [step * kWaves]: cosine, sine
  [[nodiscard]] std::uint64_t seed() const { return seed_; }

 private:
  std::uint64_t seed_;
  std::vector<Pair> phase_;
};

/// The field at one place.
class CellDraws {
 public:
  CellDraws(const Draws& draws, GeoPoint place);
  /// Value on a step, nearly normal with variance kWaves / 2.
  [[nodiscard]] double operator()(std::size_t step) const {
    const auto* phase = draws_->phases().data() + step * kWaves;
    double sum = 0;
    for (std::size_t m = 0; m < kWaves; ++m) sum += wave_[m][0] * phase[m][0] - wave_[m][1] * phase[m][1];
    return sum;
  }

 private:
  const Draws* draws_;
  std::array<std::array<double, 2>, kWaves> wave_;
};

}  // namespace windrow::adjust
