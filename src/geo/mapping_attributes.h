// Reading the attributes of a CF grid mapping: numbers, texts, the earth's shape. Projections are in cf_projection.h.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "windrow/geo/crs.h"

namespace windrow::geo {

class MappingAttributes {
 public:
  MappingAttributes(const GridMapping& mapping, const std::string& place) : mapping_(&mapping), place_(&place) {}

  [[nodiscard]] const std::string& name() const { return mapping_->name; }
  [[nodiscard]] bool has(const std::string& key) const { return find(key) != nullptr; }
  /// Error(data) when the attribute is there and no text, no number, not one number.
  [[nodiscard]] std::optional<std::string> text(const std::string& key) const;
  [[nodiscard]] std::vector<double> numbers(const std::string& key) const;  ///< empty: absent
  [[nodiscard]] std::optional<double> number(const std::string& key) const;
  /// Error(data) when absent.
  [[nodiscard]] double required(const std::string& key) const;
  /// Error(data): "grid mapping 'NAME' MESSAGE".
  [[noreturn]] void fail(const std::string& message) const;

 private:
  using Value = std::variant<std::string, double, std::vector<double>>;
  [[nodiscard]] const Value* find(const std::string& key) const;

  const GridMapping* mapping_;
  const std::string* place_;
};

/// What a user can do about a mapping that does not say enough.
inline constexpr const char* kAddCrs = "add grid = { crs = \"...\" } to the [[run]]";

/// Ellipsoid and prime meridian as PROJ parameters, " +a=6378137 +rf=298.257223563 +pm=0"; read from numbers, else from
/// the names of an ellipsoid, a datum or a geographic CRS. Error(data): none of them, or some that do not agree.
std::string earth_shape(const MappingAttributes& attributes);

}  // namespace windrow::geo
