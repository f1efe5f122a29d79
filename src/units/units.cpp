// Conversions between units: plain ones, and mass of water to depth. Spelling is in repair.cpp.
#include "windrow/units/units.h"

#include <fmt/format.h>

#include "library.h"
#include "water.h"
#include "windrow/base/constants.h"
#include "windrow/base/error.h"

namespace windrow::units {
namespace {

/// Units as they came, made fit for a message.
std::string shown(const std::string& units) {
  std::string result = units.substr(0, 80);
  for (char& c : result) {
    if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f) c = '?';
  }
  return result;
}

bool of_temperature(const Library& library, const Library::Unit& unit) {
  return library.convertible(unit, library.parse("K"));
}

/// "C" and "F" as a user means them opposite a temperature; null for anything else.
Library::Unit meant_temperature(const Library& library, const std::string& text, const Library::Unit& other) {
  if ((text != "C" && text != "F") || !of_temperature(library, other)) return nullptr;
  return library.parse("deg" + text);
}

Affine affine_of(const Library& library, const Library::Unit& from, const Library::Unit& to, const Error& failure) {
  const auto affine = library.affine(from, to);
  if (!affine) throw failure;
  return *affine;
}

}  // namespace

bool known(const std::string& units) {
  const std::string text = repaired(units, nullptr);
  return Library().parse(text) != nullptr;
}

Conversion conversion(const std::string& from, const std::string& to, const std::string& standard_name,
                      const std::string& place) {
  const std::string from_text = repaired(from, nullptr), to_text = repaired(to, nullptr);
  const Library library;
  const auto parsed = [&](const std::string& text, const std::string& given) {
    Library::Unit unit = library.parse(text);
    if (!unit) throw Error(Failure::data, place, fmt::format("units '{}' are not known to UDUNITS", shown(given)));
    return unit;
  };
  Library::Unit source = parsed(from_text, from), target = parsed(to_text, to);
  const Error failure(Failure::data, place,
                      from_text.empty() ? fmt::format("no units are given; expected some that convert to '{}'", shown(to))
                                        : fmt::format("units '{}' cannot be converted to '{}'", shown(from), shown(to)));

  Conversion result;
  result.standard_name = standard_name;
  if (!library.convertible(source, target)) {
    const Library::Unit meant_source = meant_temperature(library, from_text, target);
    const Library::Unit meant_target = meant_temperature(library, to_text, source);
    if (meant_source || meant_target) {
      const std::string& letter = meant_source ? from_text : to_text;
      result.affine = meant_source ? affine_of(library, meant_source, target, failure)
                                   : affine_of(library, source, meant_target, failure);
      result.note = fmt::format("units '{}' are read as 'deg{}'", letter, letter);
      return result;
    }
  }
  if (library.convertible(source, target)) {
    result.affine = affine_of(library, source, target, failure);
    return result;
  }

  const Library::Unit density = library.parse(fmt::format("{} kg m-3", kWaterDensity));
  const Library::Unit source_depth = library.quotient(source, density);
  const Library::Unit target_depth = library.quotient(target, density);
  const auto is_depth = [&](const Library::Unit& unit) {
    return library.convertible(unit, library.parse("m")) || library.convertible(unit, library.parse("m s-1"));
  };
  const bool to_depth = source_depth && is_depth(target) && library.convertible(source_depth, target);
  const bool to_mass = target_depth && is_depth(source) && library.convertible(source, target_depth);
  if (!to_depth && !to_mass) throw Error(failure);
  const auto name = water_name(standard_name, to_depth);
  if (!name) {
    throw Error(Failure::data, place,
                fmt::format("units '{}' cannot be converted to '{}': {} is not known to be water", shown(from),
                            shown(to), shown(standard_name)));
  }
  result.affine =
      to_depth ? affine_of(library, source_depth, target, failure) : affine_of(library, source, target_depth, failure);
  result.standard_name = *name;
  result.note = fmt::format("{} kg m-3", kWaterDensity);
  return result;
}

bool is_temperature(const std::string& units) {
  const std::string text = repaired(units, nullptr);
  const Library library;
  const Library::Unit unit = library.parse(text);
  if (!unit || !of_temperature(library, unit)) return false;
  const auto affine = library.affine(unit, library.parse("K"));
  return affine && affine->offset != 0;
}

}  // namespace windrow::units
