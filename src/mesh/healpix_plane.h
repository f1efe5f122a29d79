// The plane of the HEALPix projection on an integer lattice, and its way to the globe: Gorski et al. 2005 (ApJ 622,
// 759). Which cells a mesh has is not known here.
#pragma once
#include <cstdint>
#include <numbers>

#include "windrow/mesh/cell_records.h"
#include "windrow/mesh/mesh.h"

namespace windrow::mesh::healpix {

inline constexpr int kMostLevel = 29;
/// Lattice steps along a side of one of the 12 base cells: the middles of the finest cells' sides lie on the lattice.
inline constexpr std::int64_t kBase = std::int64_t{1} << (kMostLevel + 1);

inline std::uint64_t cells_of_level(int level) { return std::uint64_t{12} << (2 * level); }
inline double cell_area(int level) {  ///< sr
  return 4 * std::numbers::pi / static_cast<double>(cells_of_level(level));
}

/// A cell by its base cell and its column and row in it: `x` grows to the north-east, `y` to the north-west.
struct FaceCell {
  int face = 0;
  std::int64_t x = 0, y = 0;
};
FaceCell face_cell(const HealpixCell& cell);
HealpixCell nested_cell(int level, const FaceCell& cell);

/// A place of the plane. In units of pi/4 / kBase, `up` is y_s of the paper (0: equator, +-2 kBase: poles) and `right`
/// is x_s, 0 <= right < 8 kBase. Beyond +-kBase the plane has four points; what both sides of a gap share is one place
/// on the globe, and stands for it with the `right` of the western side.
struct Place {
  std::int64_t up = 0, right = 0;
  [[nodiscard]] bool polar() const { return up > kBase || up < -kBase; }
  /// Distance from the pole along the plane.
  [[nodiscard]] std::int64_t from_pole() const { return 2 * kBase - (up < 0 ? -up : up); }
};
Place place_of(int face, std::int64_t x, std::int64_t y);  ///< x, y: lattice steps from the base cell's southern corner

/// One number for a place, and back.
std::uint64_t key_of(const Place& place);
Place place_of_key(std::uint64_t key);

/// A side of a cell (of any level), known by its middle: the lattice tells direction and length.
struct Side {
  Place middle;
  std::int64_t half = 1;  ///< half its length, in lattice steps
  int right = 1;          ///< its upper end lies to the right (1) or to the left (-1) of its lower end

  [[nodiscard]] int level() const;
  [[nodiscard]] Place lower() const;
  [[nodiscard]] Place upper() const;
  /// Middle of its lower (-1) or upper (1) half.
  [[nodiscard]] Place half_middle(int which) const;
  /// Along a meridian: the gap between two points of the plane.
  [[nodiscard]] bool on_gap() const;
};
Side side_of_middle(const Place& middle);

/// How latitudes of the projection (authalic) become latitudes of the unit sphere.
struct Latitudes {
  double e2_of_file = 0;
  Earth earth;
  [[nodiscard]] bool cancel() const { return e2_of_file == earth.e2; }
};
sphere::Vec3 on_globe(const Place& place, const Latitudes& latitudes);
/// The point at the fraction `f` from the lower end of the side.
sphere::Vec3 on_globe(const Side& side, double f, const Latitudes& latitudes);

/// The cell's centre in the latitude of its file.
GeoPoint centre(const HealpixCell& cell, double e2_of_file);

/// The finest cell at a longitude in degrees and a distance from the equator along the plane (-2..2, in pi/4);
/// `from_pole` is 2 - |up|, given apart because that difference would lose what small distances need.
HealpixCell finest_at(double longitude_deg, double up, double from_pole);

}  // namespace windrow::mesh::healpix
