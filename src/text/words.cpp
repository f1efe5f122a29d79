// Small text helpers. No locale: numbers are read and written with a point.
#include "windrow/text/words.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <cmath>
#include <limits>

namespace windrow::text {
namespace {

bool is_blank(char c) { return c == ' ' || c == '\t' || c == '\r' || c == '\n'; }

struct Factor {
  const char* name;
  double factor;
};

/// The number times the factor of its unit; nullopt for an unknown unit. A bare number needs an entry "".
template <std::size_t N>
std::optional<double> scaled(std::string_view text, const std::array<Factor, N>& factors) {
  const auto quantity = parse_quantity(text);
  if (!quantity) return std::nullopt;
  const std::string unit = lower(quantity->second);
  for (const Factor& factor : factors) {
    if (unit == factor.name) return quantity->first * factor.factor;
  }
  return std::nullopt;
}

/// Damerau-Levenshtein distance with swaps of neighbours (optimal string alignment), three rows kept.
std::size_t edit_distance(const std::string& a, const std::string& b) {
  std::vector<std::size_t> before(b.size() + 1), last(b.size() + 1), row(b.size() + 1);
  for (std::size_t j = 0; j <= b.size(); ++j) last[j] = j;
  for (std::size_t i = 1; i <= a.size(); ++i) {
    row[0] = i;
    for (std::size_t j = 1; j <= b.size(); ++j) {
      const std::size_t change = last[j - 1] + (a[i - 1] != b[j - 1]);
      row[j] = std::min({last[j] + 1, row[j - 1] + 1, change});
      if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) row[j] = std::min(row[j], before[j - 2] + 1);
    }
    std::swap(before, last);
    std::swap(last, row);
  }
  return last[b.size()];
}

}  // namespace

std::string lower(std::string_view text) {
  std::string result(text);
  for (char& c : result) c = c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
  return result;
}

std::string trimmed(std::string_view text) {
  while (!text.empty() && is_blank(text.front())) text.remove_prefix(1);
  while (!text.empty() && is_blank(text.back())) text.remove_suffix(1);
  return std::string(text);
}

std::string nearest_word(std::string_view word, const std::vector<std::string>& candidates) {
  const std::string wanted = lower(trimmed(word));
  std::size_t limit = std::max<std::size_t>(1, wanted.size() / 3);
  std::string best;
  if (wanted.empty()) return best;
  for (const std::string& candidate : candidates) {
    const std::size_t longer = std::max(candidate.size(), wanted.size());
    if (longer - std::min(candidate.size(), wanted.size()) > limit) continue;
    const std::size_t distance = edit_distance(wanted, lower(candidate));
    if (distance < limit || (distance == limit && best.empty())) {
      best = candidate;
      limit = distance;
    }
  }
  return best;
}

std::string alternatives(const std::vector<std::string>& words) {
  std::string result;
  for (std::size_t i = 0; i < words.size(); ++i) {
    if (i > 0) result += i + 1 == words.size() ? " or " : ", ";
    result += words[i];
  }
  return result;
}

std::optional<std::pair<double, std::string>> parse_quantity(std::string_view text) {
  const std::string whole = trimmed(text);
  const char* first = whole.data();
  const char* last = first + whole.size();
  if (first != last && *first == '+') {
    ++first;
    if (first != last && *first == '-') return std::nullopt;
  }
  double value = 0;
  const auto [end, error] = std::from_chars(first, last, value);
  if (error != std::errc() || !std::isfinite(value)) return std::nullopt;
  return std::pair{value, trimmed(std::string_view(end, static_cast<std::size_t>(last - end)))};
}

std::optional<double> parse_number(std::string_view text) {
  const auto quantity = parse_quantity(text);
  if (!quantity || !quantity->second.empty()) return std::nullopt;
  return quantity->first;
}

std::optional<std::int64_t> parse_bytes(std::string_view text) {
  static constexpr std::array<Factor, 11> kSizes = {{{"", 1},
                                                     {"b", 1},
                                                     {"bytes", 1},
                                                     {"kb", 1e3},
                                                     {"mb", 1e6},
                                                     {"gb", 1e9},
                                                     {"tb", 1e12},
                                                     {"kib", 1024},
                                                     {"mib", 1024.0 * 1024},
                                                     {"gib", 1024.0 * 1024 * 1024},
                                                     {"tib", 1024.0 * 1024 * 1024 * 1024}}};
  const auto bytes = scaled(text, kSizes);
  constexpr double kTooMany = 9223372036854775808.0;  // 2^63
  if (!bytes || *bytes < 0 || *bytes >= kTooMany) return std::nullopt;
  return static_cast<std::int64_t>(*bytes);
}

namespace {

std::optional<int> whole_count(std::string_view text, const std::array<Factor, 2>& words) {
  const auto count = scaled(text, words);
  if (!count || *count < 0 || *count > std::numeric_limits<int>::max() || *count != std::floor(*count)) {
    return std::nullopt;
  }
  return static_cast<int>(*count);
}

}  // namespace

std::optional<int> parse_days(std::string_view text) { return whole_count(text, {{{"day", 1}, {"days", 1}}}); }

std::optional<int> parse_years(std::string_view text) { return whole_count(text, {{{"year", 1}, {"years", 1}}}); }

std::optional<double> parse_seconds(std::string_view text) {
  static constexpr std::array<Factor, 14> kTimes = {{{"s", 1},
                                                     {"sec", 1},
                                                     {"second", 1},
                                                     {"seconds", 1},
                                                     {"min", 60},
                                                     {"minute", 60},
                                                     {"minutes", 60},
                                                     {"h", 3600},
                                                     {"hr", 3600},
                                                     {"hour", 3600},
                                                     {"hours", 3600},
                                                     {"d", 86400},
                                                     {"day", 86400},
                                                     {"days", 86400}}};
  const auto seconds = scaled(text, kTimes);
  if (!seconds || *seconds < 0 || !std::isfinite(*seconds)) return std::nullopt;
  return seconds;
}

std::string bytes_text(std::int64_t bytes) {
  static constexpr std::array<const char*, 6> kUnits = {"KiB", "MiB", "GiB", "TiB", "PiB", "EiB"};
  if (bytes < 0) return bytes == std::numeric_limits<std::int64_t>::min() ? "-8.0 EiB" : "-" + bytes_text(-bytes);
  if (bytes < 1024) return fmt::format("{} B", bytes);
  double value = static_cast<double>(bytes) / 1024;
  std::size_t unit = 0;
  // 1023.95 and more would print as 1024.0 of the smaller unit.
  while (value >= 1023.95 && unit + 1 < kUnits.size()) {
    value /= 1024;
    ++unit;
  }
  return fmt::format("{:.1f} {}", value, kUnits[unit]);
}

}  // namespace windrow::text
