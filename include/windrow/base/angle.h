// Strong types for angles and positions on the globe.
#pragma once
#include <numbers>

namespace windrow {

/// An angle; no conversion from a bare number, so degrees and radians cannot be mixed up.
class Angle {
 public:
  constexpr Angle() = default;
  static constexpr Angle degrees(double d) { return Angle(d / 180.0 * std::numbers::pi); }
  static constexpr Angle radians(double r) { return Angle(r); }
  [[nodiscard]] constexpr double degrees() const { return rad_ / std::numbers::pi * 180.0; }
  [[nodiscard]] constexpr double radians() const { return rad_; }
  constexpr auto operator<=>(const Angle&) const = default;

 private:
  explicit constexpr Angle(double r) : rad_(r) {}
  double rad_ = 0;
};

struct GeoPoint {
  Angle longitude;
  Angle latitude;
};

}  // namespace windrow
