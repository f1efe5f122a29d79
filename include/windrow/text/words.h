// Small text helpers: near misses, numbers, durations, sizes. Blanks around a text never matter; nothing here throws.
#pragma once
#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace windrow::text {

/// The candidate nearest to `word`, upper and lower case alike (Damerau-Levenshtein distance, adjacent swaps, at most a
/// third of the word's length, at least 1; the first of equals), or empty.
std::string nearest_word(std::string_view word, const std::vector<std::string>& candidates);
/// "a, b or c"
std::string alternatives(const std::vector<std::string>& words);
std::optional<double> parse_number(std::string_view text);       ///< whole text, C locale, finite; nullopt otherwise
std::optional<std::int64_t> parse_bytes(std::string_view text);  ///< "4 GiB", "512MiB", "1 GB", "1000"; not negative
std::optional<int> parse_days(std::string_view text);            ///< "31 days", "1 day"; not negative
std::optional<int> parse_years(std::string_view text);           ///< "30 years", "1 year"; not negative
std::optional<double> parse_seconds(std::string_view text);      ///< "0 min", "90 s", "2 h", "1 day"; not negative
/// "number unit" -> both; e.g. "-6.5 K/km", "1 mm/day"; the unit is empty for a bare number and is not looked at.
std::optional<std::pair<double, std::string>> parse_quantity(std::string_view text);
std::string bytes_text(std::int64_t bytes);  ///< "1.4 GiB"
std::string lower(std::string_view text);
std::string trimmed(std::string_view text);

}  // namespace windrow::text
