// The only includer of UDUNITS-2.
#include "library.h"

#include <udunits2.h>

#include <cmath>
#include <limits>

#include "windrow/base/error.h"

namespace windrow::units {
namespace {

std::mutex& process_lock() {
  static std::mutex mutex;
  return mutex;
}

/// Read once, under the lock, and kept for the life of the process.
ut_system* unit_system() {
  static ut_system* const system = [] {
    ut_set_error_message_handler(ut_ignore);
    return ut_read_xml(nullptr);
  }();
  return system;
}

/// A ratio within a few rounding errors of a whole number, or of one over a whole number, is that number: units are
/// defined by such ratios, and the library's products of factors lose their last bit.
double whole_ratio(double scale) {
  const double tolerance = 4 * std::numeric_limits<double>::epsilon();
  const double whole = std::round(scale), inverse = std::round(1 / scale);
  if (whole != 0 && std::fabs(scale / whole - 1) <= tolerance) return whole;
  if (inverse != 0 && std::fabs(scale * inverse - 1) <= tolerance) return 1 / inverse;
  return scale;
}

}  // namespace

void Library::Free::operator()(ut_unit* unit) const { ut_free(unit); }

Library::Library() : lock_(process_lock()) {
  if (unit_system() == nullptr) {
    throw Error(Failure::missing, "UDUNITS",
                "its unit data cannot be read; expected them installed, or UDUNITS2_XML_PATH");
  }
}

Library::Unit Library::parse(const std::string& text) const {
  constexpr std::size_t kLongest = 256;
  if (text.size() > kLongest || text.find('\0') != std::string::npos) return nullptr;
  return Unit(ut_parse(unit_system(), text.c_str(), UT_UTF8));
}

Library::Unit Library::quotient(const Unit& a, const Unit& b) const { return Unit(ut_divide(a.get(), b.get())); }

bool Library::convertible(const Unit& a, const Unit& b) const { return ut_are_convertible(a.get(), b.get()) != 0; }

std::optional<Affine> Library::affine(const Unit& from, const Unit& to) const {
  const std::unique_ptr<cv_converter, void (*)(cv_converter*)> converter(ut_get_converter(from.get(), to.get()),
                                                                         cv_free);
  if (!converter) return std::nullopt;
  const auto y = [&](double x) { return cv_convert_double(converter.get(), x); };
  // Far out, an offset does not touch the digits of the scale.
  constexpr double kFar = 1152921504606846976.0;  // 2^60
  const double offset = y(0), scale = (y(kFar) - offset) / kFar;
  if (!std::isfinite(scale) || !std::isfinite(offset)) return std::nullopt;
  const Affine affine{whole_ratio(scale), offset};
  for (const double x : {1.0, 250.0}) {
    const double expected = y(x), size = std::fabs(affine.scale * x) + std::fabs(offset);
    if (!(std::fabs(affine(x) - expected) <= 16 * std::numeric_limits<double>::epsilon() * size)) return std::nullopt;
  }
  return affine;
}

}  // namespace windrow::units
