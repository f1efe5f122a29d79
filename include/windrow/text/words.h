// Small text helpers: near misses, numbers, durations, sizes, significant formatting.
#pragma once
#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace windrow::text {

/// The candidate nearest to `word` (Damerau-Levenshtein distance at most a third of the length, at least 1), or empty.
std::string nearest_word(std::string_view word, const std::vector<std::string>& candidates);
/// "a, b or c"
std::string alternatives(const std::vector<std::string>& words);
std::optional<double> parse_number(std::string_view text);       ///< whole text, C locale; nullopt otherwise
std::optional<std::int64_t> parse_bytes(std::string_view text);  ///< "4 GiB", "512MiB", "1 GB", "1000"
std::optional<int> parse_days(std::string_view text);            ///< "31 days", "1 day"
std::optional<double> parse_seconds(std::string_view text);      ///< "0 min", "90 s", "2 h"
/// "number unit" -> both; e.g. "-6.5 K/km", "1 mm/day".
std::optional<std::pair<double, std::string>> parse_quantity(std::string_view text);
std::string bytes_text(std::int64_t bytes);                      ///< "1.4 GiB"
std::string lower(std::string_view text);
std::string trimmed(std::string_view text);

}  // namespace windrow::text
