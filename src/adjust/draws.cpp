// Waves and phases of the random field, from counters alone. Square roots and + - * / are exact on every machine; the
// sine and cosine of a place come from a polynomial, so no mathematical library decides what rains.
#include "windrow/adjust/draws.h"

#include <cmath>

namespace windrow::adjust {
namespace {

constexpr double kShortest_km = 300, kLongest_km = 1500, kEarth_km = 6371;

std::uint64_t mixed(std::uint64_t x) {
  x += 0x9e3779b97f4a7c15ULL;
  x = (x ^ (x >> 30)) * 0xbf58476d1ce4e5b9ULL;
  x = (x ^ (x >> 27)) * 0x94d049bb133111ebULL;
  return x ^ (x >> 31);
}

/// The n-th number of a stream, uniform in [-1, 1).
double signed_uniform(std::uint64_t stream, std::uint64_t n) {
  return static_cast<double>(mixed(stream + mixed(n)) >> 11) * 0x1p-52 - 1;
}

/// A direction in the plane, by rejection from the square.
Draws::Pair on_circle(std::uint64_t stream) {
  for (std::uint64_t n = 0;; n += 2) {
    const double x = signed_uniform(stream, n), y = signed_uniform(stream, n + 1);
    const double size = x * x + y * y;
    if (size > 1 || size < 1e-6) continue;
    const double r = std::sqrt(size);
    return {x / r, y / r};
  }
}

/// A direction in space, likewise from the cube.
std::array<double, 3> on_sphere(std::uint64_t stream) {
  for (std::uint64_t n = 0;; n += 3) {
    const double x = signed_uniform(stream, n), y = signed_uniform(stream, n + 1), z = signed_uniform(stream, n + 2);
    const double size = x * x + y * y + z * z;
    if (size > 1 || size < 1e-6) continue;
    const double r = std::sqrt(size);
    return {x / r, y / r, z / r};
  }
}

/// Cosine and sine of an angle in turns, by Taylor sums within an eighth of a turn (remainder below 1e-17).
Draws::Pair cos_sin_turns(double turns) {
  const double quarter = std::floor(turns * 4 + 0.5);
  const double x = (turns - quarter / 4) * 6.283185307179586;
  double c = 1, s = 1;
  for (int n = 20; n >= 2; n -= 2) c = 1 - c * (x * x) / (n * (n - 1));
  for (int n = 21; n >= 3; n -= 2) s = 1 - s * (x * x) / (n * (n - 1));
  s *= x;
  switch (static_cast<int>(quarter - 4 * std::floor(quarter / 4))) {
    case 0:
      return {c, s};
    case 1:
      return {-s, c};
    case 2:
      return {-c, -s};
    default:
      return {s, -c};
  }
}

}  // namespace

Draws::Draws(std::uint64_t seed, const std::vector<calendar::Date>& dates) : seed_(seed) {
  phase_.reserve(dates.size() * kWaves);
  for (const calendar::Date& date : dates) {
    const auto day =
        static_cast<std::uint64_t>((static_cast<std::int64_t>(date.year) * 12 + date.month) * 31 + date.day);
    for (std::size_t m = 0; m < kWaves; ++m) phase_.push_back(on_circle(mixed(seed ^ mixed(day)) + mixed(m)));
  }
}

CellDraws::CellDraws(const Draws& draws, GeoPoint place) : draws_(&draws), wave_{} {
  const Draws::Pair lambda = cos_sin_turns(place.longitude.degrees() / 360);
  const Draws::Pair phi = cos_sin_turns(place.latitude.degrees() / 360);
  const std::array<double, 3> r{phi[0] * lambda[0], phi[0] * lambda[1], phi[1]};
  for (std::size_t m = 0; m < kWaves; ++m) {
    const std::uint64_t stream = mixed(draws.seed() + 0x5eedULL) + mixed(m);
    const std::array<double, 3> k = on_sphere(stream);
    // Lengths evenly spread in wave number.
    const double part = 0.5 + 0.5 * signed_uniform(mixed(stream), 0);
    const double waves = kEarth_km / kLongest_km + part * (kEarth_km / kShortest_km - kEarth_km / kLongest_km);
    wave_[m] = cos_sin_turns(waves * (k[0] * r[0] + k[1] * r[1] + k[2] * r[2]));
  }
}

}  // namespace windrow::adjust
