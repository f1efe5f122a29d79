// Common misspellings of units, as text. What a unit means is the unit library's business.
#include <fmt/format.h>

#include <array>
#include <string_view>

#include "windrow/units/units.h"

namespace windrow::units {
namespace {

struct Spelling {
  std::string_view wrong, right;
};

// Whole units, compared in lower case with '_' as a blank. Common practice in data files, no published list.
constexpr Spelling kWholes[] = {{"deg c", "degC"},
                                {"degc", "degC"},
                                {"degree c", "degC"},
                                {"degrees c", "degC"},
                                {"degreec", "degC"},
                                {"degreesc", "degC"},
                                {"celsius", "degC"},
                                {"degree celsius", "degC"},
                                {"degrees celsius", "degC"},
                                {"deg celsius", "degC"},
                                {"\u00b0c", "degC"},
                                {"\u00b0 c", "degC"},
                                {"\u2103", "degC"},
                                {"deg f", "degF"},
                                {"degf", "degF"},
                                {"degree f", "degF"},
                                {"degrees f", "degF"},
                                {"fahrenheit", "degF"},
                                {"degree fahrenheit", "degF"},
                                {"degrees fahrenheit", "degF"},
                                {"\u00b0f", "degF"},
                                {"\u00b0 f", "degF"},
                                {"\u2109", "degF"},
                                {"deg k", "K"},
                                {"degree k", "K"},
                                {"degrees k", "K"},
                                {"degree kelvin", "K"},
                                {"degrees kelvin", "K"},
                                {"mb", "millibar"},
                                {"mbs", "millibar"},
                                {"mbars", "millibar"},
                                {"millibars", "millibar"},
                                {"hpa", "hPa"},
                                {"mps", "m s-1"},
                                {"kph", "km h-1"},
                                {"kmh", "km h-1"},
                                {"km/hour", "km h-1"},
                                {"mm/24h", "mm day-1"},
                                {"mm/24 h", "mm day-1"},
                                {"mm/24hr", "mm day-1"},
                                {"mm 24h-1", "mm day-1"},
                                {"gpm", "m"},
                                {"fraction", "1"},
                                {"frac", "1"},
                                {"none", "1"},
                                {"unitless", "1"},
                                {"dimensionless", "1"},
                                {"-", "1"},
                                {"0-1", "1"},
                                {"(0-1)", "1"},
                                {"(0 - 1)", "1"},
                                {"percentage", "%"},
                                {"pct", "%"}};

// Pieces anywhere in the text.
constexpr Spelling kPieces[] = {{"**", ""},      {"\u207b", "-"}, {"\u2212", "-"}, {"\u2070", "0"}, {"\u00b9", "1"},
                                {"\u00b2", "2"}, {"\u00b3", "3"}, {"\u2074", "4"}, {"\u00b7", "."}};

// Words with their exponent or after a slash.
constexpr Spelling kWords[] = {{"d", "day"}, {"dy", "day"}};

bool is_letter(char c) { return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_' || (c & 0x80) != 0; }
bool is_blank(char c) { return c == ' ' || c == '\t' || c == '\n' || c == '\r'; }

/// Outer blanks dropped, inner runs of blanks made one.
std::string tidied(const std::string& text) {
  std::string result;
  for (const char c : text) {
    if (!is_blank(c)) {
      result += c;
    } else if (!result.empty() && result.back() != ' ') {
      result += ' ';
    }
  }
  while (!result.empty() && result.back() == ' ') result.pop_back();
  return result;
}

/// True for text whose bytes above 0x7f come as a lead and its continuations (all that units need of UTF-8).
bool looks_like_utf8(const std::string& text) {
  int expected = 0;
  for (const char c : text) {
    const unsigned byte = static_cast<unsigned char>(c);
    const bool continuation = byte >= 0x80 && byte < 0xc0;
    if (continuation != (expected > 0)) return false;
    expected = continuation ? expected - 1 : byte >= 0xf0 ? 3 : byte >= 0xe0 ? 2 : byte >= 0xc0 ? 1 : 0;
  }
  return expected == 0;
}

/// ISO 8859-1 to UTF-8.
std::string from_latin1(const std::string& text) {
  std::string result;
  for (const char c : text) {
    const unsigned byte = static_cast<unsigned char>(c);
    if (byte < 0x80) {
      result += c;
    } else {
      result += static_cast<char>(0xc0 | (byte >> 6));
      result += static_cast<char>(0x80 | (byte & 0x3f));
    }
  }
  return result;
}

void replace_pieces(std::string& text) {
  for (const Spelling& piece : kPieces) {
    for (std::size_t at = text.find(piece.wrong); at != std::string::npos; at = text.find(piece.wrong, at)) {
      text.replace(at, piece.wrong.size(), piece.right);
      at += piece.right.size();
    }
  }
}

/// Replaces kWords where an exponent follows or a slash goes before: "mm d-1", "mm/d".
void replace_words(std::string& text) {
  for (std::size_t start = 0; start < text.size();) {
    std::size_t end = start;
    while (end < text.size() && is_letter(text[end])) ++end;
    if (end == start) {
      ++start;
      continue;
    }
    const bool exponent = end < text.size() && (text[end] == '-' || text[end] == '^');
    const bool slash = start > 0 && text[start - 1] == '/';
    for (const Spelling& word : kWords) {
      if ((exponent || slash) && std::string_view(text).substr(start, end - start) == word.wrong) {
        text.replace(start, end - start, word.right);
        end = start + word.right.size();
        break;
      }
    }
    start = end;
  }
}

std::string folded(const std::string& text) {
  std::string result = text;
  for (char& c : result) c = c == '_' ? ' ' : c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
  return result;
}

}  // namespace

std::string repaired(const std::string& units, std::string* odd) {
  const std::string readable = looks_like_utf8(units) ? units : from_latin1(units);
  std::string result = tidied(readable);
  const std::string blank_free = result;
  bool whole = false;
  for (const Spelling& spelling : kWholes) {
    if (folded(result) == spelling.wrong) {
      result = spelling.right;
      whole = true;
      break;
    }
  }
  if (!whole) {
    replace_pieces(result);
    replace_words(result);
  }
  // Blanks alone are not worth a word.
  if (odd != nullptr && (result != blank_free || readable != units)) {
    *odd = fmt::format("units '{}' are read as '{}'", blank_free, result);
  }
  return result;
}

bool per_month(const std::string& units, std::string* amount) {
  constexpr std::array<std::string_view, 10> kEnds = {"/month", "/months",   "/mon",     " month-1",   " months-1",
                                                      " mon-1", " month^-1", ".month-1", " per month", "/ month"};
  const std::string text = repaired(units, nullptr);
  const std::string lower = folded(text);
  for (const std::string_view end : kEnds) {
    if (lower.size() > end.size() && std::string_view(lower).substr(lower.size() - end.size()) == end) {
      if (amount != nullptr) *amount = tidied(text.substr(0, text.size() - end.size()));
      return true;
    }
  }
  return false;
}

}  // namespace windrow::units
