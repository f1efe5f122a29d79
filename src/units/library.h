// The unit library behind one lock: parsed units that free themselves, and converters reduced to scale and offset.
#pragma once
#include <memory>
#include <mutex>
#include <optional>
#include <string>

#include "windrow/units/units.h"

// The library's opaque type, so that its header stays in library.cpp.
union ut_unit;

namespace windrow::units {

/// Holds the process-wide lock of the unit library for its lifetime; every call into the library goes through it.
class Library {
 public:
  struct Free {
    void operator()(ut_unit* unit) const;
  };
  using Unit = std::unique_ptr<ut_unit, Free>;

  Library();  ///< Error(missing) when the library's unit data cannot be read
  [[nodiscard]] Unit parse(const std::string& text) const;  ///< null when unknown
  [[nodiscard]] Unit quotient(const Unit& a, const Unit& b) const;
  [[nodiscard]] bool convertible(const Unit& a, const Unit& b) const;
  /// nullopt when the conversion is not of the form scale * x + offset (logarithmic units).
  [[nodiscard]] std::optional<Affine> affine(const Unit& from, const Unit& to) const;

 private:
  std::lock_guard<std::mutex> lock_;
};

}  // namespace windrow::units
