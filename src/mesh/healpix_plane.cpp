// Integer arithmetic on the lattice of the plane, and the equations of the projection. Angles are reduced to within 45
// degrees of a multiple of 90 before anything is rounded, so that what is symmetric on the globe is so in its bits.
#include "healpix_plane.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <numbers>

#include "surface.h"

namespace windrow::mesh::healpix {
namespace {

using sphere::Vec3;

constexpr double kUnit = static_cast<double>(kBase);

// Every second bit of a number, moved together, and the way back: runs of bits are moved by half their distance in
// turn.
std::int64_t even_bits(std::uint64_t n) {
  n &= 0x5555555555555555U;
  n = (n | (n >> 1)) & 0x3333333333333333U;
  n = (n | (n >> 2)) & 0x0f0f0f0f0f0f0f0fU;
  n = (n | (n >> 4)) & 0x00ff00ff00ff00ffU;
  n = (n | (n >> 8)) & 0x0000ffff0000ffffU;
  return static_cast<std::int64_t>((n | (n >> 16)) & 0x00000000ffffffffU);
}
std::uint64_t spread_bits(std::int64_t of) {
  auto n = static_cast<std::uint64_t>(of);
  n = (n | (n << 16)) & 0x0000ffff0000ffffU;
  n = (n | (n << 8)) & 0x00ff00ff00ff00ffU;
  n = (n | (n << 4)) & 0x0f0f0f0f0f0f0f0fU;
  n = (n | (n << 2)) & 0x3333333333333333U;
  return (n | (n << 1)) & 0x5555555555555555U;
}

// Horizontal place of a base cell's middle, in kBase: F2 of the paper.
std::int64_t middle_of(int face) { return 2 * (face % 4) + (face / 4 == 1 ? 0 : 1); }

std::int64_t wrap(std::int64_t right) { return ((right % (8 * kBase)) + 8 * kBase) % (8 * kBase); }

// Horizontal middle of the point of the plane that holds a polar place.
std::int64_t point_middle(const Place& place) { return (place.right - 1) / (2 * kBase) * 2 * kBase + kBase; }

// A place whose coordinates may lie between lattice points. `middle`: of its point of the plane, where it is polar.
struct Exact {
  double up, right;
  std::int64_t middle;
};

// Longitude 90 * quadrant + rest, |rest| <= 45 degrees; colatitude by its sine and cosine.
struct Direction {
  std::int64_t quadrant;
  double rest_deg, sine, z;
};

// The projection turned round: z = 2/3 up on the belt, 1 - |z| = (2 - |up|)² / 3 around the poles.
Direction direction(const Exact& at) {
  const double size = std::abs(at.up);
  if (size <= kUnit) {
    const double z = 2 * at.up / (3 * kUnit);
    const auto quadrant = static_cast<std::int64_t>(std::floor(at.right / (2 * kUnit) + 0.5));
    const double rest = at.right - 2 * kUnit * static_cast<double>(quadrant);
    return {quadrant, 45 * (rest / kUnit), std::sqrt((1 - z) * (1 + z)), z};
  }
  const double from_pole = 2 * kUnit - size;
  if (from_pole == 0) return {0, 0, 0, std::copysign(1.0, at.up)};
  const double aside = at.right - static_cast<double>(at.middle);
  const std::int64_t west = (at.middle - kBase) / (2 * kBase);
  const double half_sine = from_pole / kUnit / std::sqrt(6.0);  // of half the colatitude
  const double sine = 2 * half_sine * std::sqrt(1 - half_sine * half_sine);
  const double z = std::copysign(1 - 2 * half_sine * half_sine, at.up);
  if (aside <= 0) return {west, 45 * ((from_pole + aside) / from_pole), sine, z};
  return {west + 1, -45 * ((from_pole - aside) / from_pole), sine, z};
}

double latitude_deg(const Direction& d) { return Angle::radians(std::atan2(d.z, d.sine)).degrees(); }

Vec3 vector_of(Direction d, const Latitudes& latitudes) {
  if (!latitudes.cancel()) {
    const double geodetic = geodetic_latitude_deg(latitude_deg(d), latitudes.e2_of_file);
    const sphere::SinCos phi = sphere::sincos_degrees(authalic_latitude_deg(geodetic, latitudes.earth.e2));
    d.sine = phi.cos;
    d.z = phi.sin;
  }
  const sphere::SinCos rest = sphere::sincos_degrees(d.rest_deg);
  const double along = d.sine * rest.cos;
  const double across = d.sine * rest.sin;
  switch (d.quadrant & 3) {
    case 0:
      return {along, across, d.z};
    case 1:
      return {-across, along, d.z};
    case 2:
      return {-along, -across, d.z};
    default:
      return {across, -along, d.z};
  }
}

}  // namespace

FaceCell face_cell(const HealpixCell& cell) {
  const std::uint64_t within = cell.nested & ((std::uint64_t{1} << (2 * cell.level)) - 1);
  return {static_cast<int>(cell.nested >> (2 * cell.level)), even_bits(within), even_bits(within >> 1)};
}

HealpixCell nested_cell(int level, const FaceCell& cell) {
  const std::uint64_t face = static_cast<std::uint64_t>(cell.face) << (2 * level);
  return {level, face | spread_bits(cell.x) | (spread_bits(cell.y) << 1)};
}

Place place_of(int face, std::int64_t x, std::int64_t y) {
  Place place{x + y - (face / 4) * kBase, wrap(middle_of(face) * kBase + x - y)};
  if (!place.polar()) return place;
  if (place.from_pole() == 0) return {place.up, 0};
  if (x - y == -place.from_pole()) place.right = wrap((middle_of(face) - 2) * kBase + place.from_pole());
  return place;
}

// up + right is even everywhere, since kBase is: half of `right` is enough. Both poles have up = 2^31 modulo 2^32.
std::uint64_t key_of(const Place& place) {
  const auto up = static_cast<std::uint32_t>(place.up + 2 * kBase);
  const std::uint64_t half = place.up == -2 * kBase ? 1 : static_cast<std::uint64_t>(place.right) >> 1;
  return (std::uint64_t{up} << 32) | half;
}

Place place_of_key(std::uint64_t key) {
  const std::uint64_t half = key & 0xffffffffU;
  const auto up = static_cast<std::int64_t>(key >> 32) - 2 * kBase;
  if (up == -2 * kBase) return {half == 1 ? up : -up, 0};
  return {up, static_cast<std::int64_t>(2 * half) + (up & 1)};
}

// In its base cell a side's middle has an odd multiple of `half` along the side and a multiple of 2 half across it.
// Base cells begin at odd multiples of kBase / 2 of (up + right) / 2 and of (up - right) / 2.
Side side_of_middle(const Place& middle) {
  const auto zeros = [](std::int64_t n) {
    return std::countr_zero(static_cast<std::uint64_t>(n + kBase / 2) | static_cast<std::uint64_t>(kBase));
  };
  const int north_east = zeros((middle.up + middle.right) / 2);
  const int north_west = zeros((middle.up - middle.right) / 2);
  return {middle, std::int64_t{1} << std::min(north_east, north_west), north_east < north_west ? 1 : -1};
}

int Side::level() const { return kMostLevel - std::countr_zero(static_cast<std::uint64_t>(half)); }

bool Side::on_gap() const {
  const std::int64_t aside = middle.right - point_middle(middle);
  return middle.polar() && (aside == middle.from_pole() || aside == -middle.from_pole());
}

namespace {

// The place on a side, `up` lattice steps above its middle.
Place along(const Side& side, std::int64_t up) {
  Place out{side.middle.up + up, side.middle.right + up * side.right};
  if (!side.middle.polar() || !out.polar()) return {out.up, wrap(out.right)};
  if (out.from_pole() == 0) return {out.up, 0};
  const std::int64_t middle = point_middle(side.middle);
  if (out.right - middle == -out.from_pole()) out.right = middle - 2 * kBase + out.from_pole();
  return {out.up, wrap(out.right)};
}

}  // namespace

Place Side::lower() const { return along(*this, -half); }
Place Side::upper() const { return along(*this, half); }
Place Side::half_middle(int which) const { return along(*this, which * (half / 2)); }

Vec3 on_globe(const Place& place, const Latitudes& latitudes) {
  const std::int64_t middle = place.polar() && place.from_pole() > 0 ? point_middle(place) : kBase;
  return vector_of(direction({static_cast<double>(place.up), static_cast<double>(place.right), middle}), latitudes);
}

Vec3 on_globe(const Side& side, double f, const Latitudes& latitudes) {
  const double along = (2 * f - 1) * static_cast<double>(side.half);
  const Exact at{static_cast<double>(side.middle.up) + along,
                 static_cast<double>(side.middle.right) + side.right * along,
                 side.middle.polar() ? point_middle(side.middle) : kBase};
  return vector_of(direction(at), latitudes);
}

GeoPoint centre(const HealpixCell& cell, double e2_of_file) {
  const FaceCell at = face_cell(cell);
  const std::int64_t size = kBase >> cell.level;
  const Place place = place_of(at.face, at.x * size + size / 2, at.y * size + size / 2);
  const std::int64_t middle = place.polar() ? point_middle(place) : kBase;
  const Direction d = direction({static_cast<double>(place.up), static_cast<double>(place.right), middle});
  double longitude = 90 * static_cast<double>(d.quadrant) + d.rest_deg;
  if (longitude < 0) longitude += 360;
  return {Angle::degrees(longitude), Angle::degrees(geodetic_latitude_deg(latitude_deg(d), e2_of_file))};
}

HealpixCell finest_at(double longitude_deg, double up, double from_pole) {
  constexpr std::int64_t size = std::int64_t{1} << kMostLevel;
  double turn = std::fmod(longitude_deg, 360.0);
  if (turn < 0) turn += 360;
  if (turn >= 360) turn = 0;
  const auto step = [](double value) {  // a value that rounding lifted over the last cell stays in it
    return std::clamp(static_cast<std::int64_t>(std::floor(value * size)), std::int64_t{0}, size - 1);
  };
  if (std::abs(up) >= 1) {
    const int quarter = std::min(3, static_cast<int>(turn / 90));
    const double east = from_pole * ((turn - 90 * quarter) / 90);
    const double west = from_pole - east;
    if (up > 0) return nested_cell(kMostLevel, {quarter, step(1 - west), step(1 - east)});
    return nested_cell(kMostLevel, {8 + quarter, step(east), step(west)});
  }
  // The belt: lines to the north-east and to the north-west through the corners of base cells.
  const double right = turn / 45;
  const double north_east = 0.5 * (up + right + 1);
  const double north_west = 0.5 * (up - right + 1);
  const double a = std::floor(north_east);
  const double b = std::floor(north_west);
  const int row = std::clamp(1 - static_cast<int>(a + b), 0, 2);
  const int quarter = static_cast<int>(row == 0 ? -b : a) & 3;
  return nested_cell(kMostLevel, {4 * row + quarter, step(north_east - a), step(north_west - b)});
}

}  // namespace windrow::mesh::healpix
