// Recognising and completing CRS definitions; no PROJ call here.
#include "definition.h"

#include <algorithm>
#include <cctype>
#include <charconv>
#include <optional>

#include "windrow/base/error.h"

namespace windrow::geo {
namespace {

std::string trimmed(const std::string& text) {
  const auto first = text.find_first_not_of(" \t\r\n");
  if (first == std::string::npos) return {};
  return text.substr(first, text.find_last_not_of(" \t\r\n") - first + 1);
}

bool is_authority_code(const std::string& text) {
  const auto colon = text.find(':');
  if (colon == 0 || colon == std::string::npos || colon + 1 == text.size()) return false;
  const auto plain = [](char c) { return std::isalnum(static_cast<unsigned char>(c)) || c == '_' || c == '.'; };
  return std::all_of(text.begin(), text.begin() + static_cast<std::ptrdiff_t>(colon), plain) &&
         std::all_of(text.begin() + static_cast<std::ptrdiff_t>(colon) + 1, text.end(), plain);
}

/// Value of `+key=` in a PROJ string.
std::optional<std::string> proj_value(const std::string& text, const std::string& key) {
  const std::string needle = "+" + key + "=";
  const auto at = text.find(needle);
  if (at == std::string::npos) return std::nullopt;
  const auto begin = at + needle.size();
  return text.substr(begin, text.find_first_of(" \t\r\n", begin) - begin);
}

std::optional<double> number(const std::optional<std::string>& text) {
  double value = 0;
  if (!text) return std::nullopt;
  const char* end = text->data() + text->size();
  const auto parsed = std::from_chars(text->data(), end, value);
  if (parsed.ec != std::errc() || parsed.ptr != end) return std::nullopt;
  return value;
}

/// With one standard parallel away from lat_0, PROJ's own formulas take lat_2 = lat_1, but its CRS reading (9.1) takes
/// lat_2 = 0: a quite different cone. Saying lat_2 keeps the meaning that the string has everywhere else.
std::string with_second_parallel(std::string text) {
  if (proj_value(text, "proj") != "lcc" || proj_value(text, "lat_2")) return text;
  const auto lat_1 = proj_value(text, "lat_1");
  if (!lat_1 || number(lat_1) == number(proj_value(text, "lat_0")) || !proj_value(text, "lat_0")) return text;
  return text + " +lat_2=" + *lat_1;
}

}  // namespace

std::string complete_definition(const std::string& definition, const std::string& place) {
  std::string text = trimmed(definition);
  if (is_authority_code(text) || text.starts_with("urn:ogc:def:crs:")) return text;
  const bool wkt = !text.empty() && std::isalpha(static_cast<unsigned char>(text[0])) && text.back() == ']';
  if (wkt || text.starts_with("{")) return text;
  if (text.find("+proj=") != std::string::npos && text.find("+init=") == std::string::npos) {
    text = with_second_parallel(std::move(text));
    if (text.find("+type=crs") == std::string::npos) text += " +type=crs";
    return text;
  }
  throw Error(Failure::job, place,
              "'" + text.substr(0, 100) + (text.size() > 100 ? "..." : "") +
                  "' is no coordinate reference system; expected a code such as \"EPSG:3035\", a PROJ string " +
                  "with +proj=, or WKT");
}

}  // namespace windrow::geo
