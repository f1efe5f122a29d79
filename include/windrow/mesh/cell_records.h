// Plain records of cells that are no latitude-longitude block, shared with readers that know no geometry.
#pragma once
#include <array>
#include <cstddef>
#include <cstdint>
#include <vector>

namespace windrow::mesh {

/// A frame whose north pole stands at (pole_lon, pole_lat), and in which the true north pole has the longitude
/// north_pole_grid_lon: CF's rotated_latitude_longitude with grid_north_pole_longitude, grid_north_pole_latitude,
/// north_pole_grid_longitude. It turns nothing for a pole at 180 degrees east, 90 degrees north.
struct Rotation {
  double pole_lon_deg = 0, pole_lat_deg = 90, north_pole_grid_lon_deg = 0;
  bool operator==(const Rotation&) const = default;
};

/// Cells by their corners, in degrees.
struct CellCorners {
  std::size_t most = 0;                  ///< corners of the cell that has most
  std::vector<double> lon_deg, lat_deg;  ///< cells x most, row by row; NaN beyond a cell's own corners
  std::vector<double> centre_lon_deg, centre_lat_deg;  ///< one a cell, or empty: the corners' mean direction
  std::size_t ny = 1, nx = 0;            ///< shape of a structured grid, (1, cells) otherwise
  double rounding_deg = 1e-9;            ///< how far the same corner may differ between cells (float32: 1e-4)
};

/// How sides run between corners.
enum class Sides : std::uint8_t {
  great_circles,
  parallels  ///< a side between two corners of one latitude runs along that latitude, all others are great circles
};

/// Faces of an unstructured mesh.
struct FaceNodes {
  std::vector<double> lon_deg, lat_deg;  ///< one a node
  std::size_t most = 0;                  ///< nodes of the face that has most
  std::vector<std::int64_t> nodes;       ///< faces x most, numbered from 0; -1 beyond a face's own nodes
  std::vector<double> centre_lon_deg, centre_lat_deg;  ///< one a face, or empty
};

struct HealpixCell {
  int level = 0;             ///< 0..29
  std::uint64_t nested = 0;  ///< 0 .. 12 * 4^level - 1
  bool operator==(const HealpixCell&) const = default;
};

/// One cell of one or more parts; each part is an outer ring and its holes, rings closed implicitly, either sense.
struct PolygonCell {
  using Ring = std::vector<std::array<double, 2>>;
  std::vector<std::vector<Ring>> parts;
};

}  // namespace windrow::mesh
