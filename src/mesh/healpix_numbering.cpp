// Cell numbers of CF 1.13 appendix F turned into level and nested number. No geometry but that of rings.
#include <fmt/format.h>

#include <bit>
#include <cmath>

#include "healpix_plane.h"
#include "windrow/base/error.h"

namespace windrow::mesh {
namespace {

using healpix::FaceCell;
using healpix::kMostLevel;

[[noreturn]] void refuse(const std::string& place, const std::string& what) { throw Error(Failure::data, place, what); }

// Place of a number in a polar cap, counted from its pole: ring 1, 2, ... and place in it from 0. Ring i begins at
// 2 i (i - 1): Gorski et al. 2005.
struct CapPlace {
  std::int64_t ring, along;
};
CapPlace cap_place(std::uint64_t number) {
  auto ring = static_cast<std::uint64_t>(0.5 * (1 + std::sqrt(1 + 2 * static_cast<double>(number))));
  while (2 * ring * (ring - 1) > number) --ring;
  while (2 * ring * (ring + 1) <= number) ++ring;
  return {static_cast<std::int64_t>(ring), static_cast<std::int64_t>(number - 2 * ring * (ring - 1))};
}

// Rings n..3n from the north, on the belt: 4n cells each. The first of a ring is centred half a cell east of Greenwich
// and on Greenwich in turn.
FaceCell belt_cell(std::int64_t n, std::int64_t ring, std::int64_t along) {
  const std::int64_t shift = (ring - n) % 2 + 1;
  const std::int64_t right = 2 * (along + 1) - shift;  // of the centre, in quarters of a base cell's width / n
  const std::int64_t up = 2 * n - ring;
  // Twice the steps from the lines through the corners of base cells; the centre is half a cell on.
  const std::int64_t north_east = up + right + n - 1;
  const std::int64_t north_west = up - right + n - 1 + 8 * n;
  const std::int64_t a = north_east / 2 / n;
  const std::int64_t b = north_west / 2 / n - 4;
  const std::int64_t row = 1 - (a + b);
  const std::int64_t quarter = (row == 0 ? -b : a) & 3;
  return {static_cast<int>(4 * row + quarter), north_east / 2 % n, north_west / 2 % n};
}

}  // namespace

HealpixCell healpix_from_ring(int level, std::uint64_t ring, const std::string& place) {
  if (level < 0 || level > kMostLevel) {
    refuse(place, fmt::format("HEALPix level {}, expected 0 to {}", level, kMostLevel));
  }
  const std::uint64_t cells = healpix::cells_of_level(level);
  if (ring >= cells) {
    refuse(place, fmt::format("HEALPix cell {} of level {}, expected 0 to {}", ring, level, cells - 1));
  }
  const std::int64_t n = std::int64_t{1} << level;
  const auto cap = static_cast<std::uint64_t>(2 * n * (n - 1));
  if (ring < cap) {
    const CapPlace at = cap_place(ring);
    const std::int64_t quarter = at.along / at.ring, along = at.along % at.ring;
    return healpix::nested_cell(level, {static_cast<int>(quarter), n - at.ring + along, n - 1 - along});
  }
  if (ring >= cells - cap) {
    const CapPlace at = cap_place(cells - 1 - ring);
    const std::int64_t from_west = 4 * at.ring - 1 - at.along;
    const std::int64_t quarter = from_west / at.ring, along = from_west % at.ring;
    return healpix::nested_cell(level, {static_cast<int>(8 + quarter), along, at.ring - 1 - along});
  }
  const auto within = static_cast<std::int64_t>(ring - cap);
  return healpix::nested_cell(level, belt_cell(n, n + within / (4 * n), within % (4 * n)));
}

HealpixCell healpix_from_nuniq(std::uint64_t nuniq, const std::string& place) {
  // nuniq lies in 4^(1 + level) .. 4^(2 + level) - 1.
  const int level = (static_cast<int>(std::bit_width(nuniq)) - 1) / 2 - 1;
  if (nuniq < 4 || level > kMostLevel) {
    refuse(place, fmt::format("HEALPix number {} in the indexing nuniq, expected 4 to {}", nuniq,
                              (std::uint64_t{1} << (2 * (kMostLevel + 2))) - 1));
  }
  return {level, nuniq - (std::uint64_t{1} << (2 * (1 + level)))};
}

HealpixCell healpix_from_zuniq(std::uint64_t zuniq, const std::string& place) {
  const int zeros = zuniq == 0 ? 1 : std::countr_zero(zuniq);
  const int level = kMostLevel - zeros / 2;
  const std::uint64_t nested = zeros < 64 ? (zuniq >> zeros) >> 1 : 0;
  if (zeros % 2 != 0 || level < 0 || nested >= healpix::cells_of_level(level)) {
    refuse(place, fmt::format("{} is no HEALPix number in the indexing zuniq, which is (2 nested + 1) * 4^({} - level)",
                              zuniq, kMostLevel));
  }
  return {level, nested};
}

}  // namespace windrow::mesh
