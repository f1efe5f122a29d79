// Reads dates, numbers and words from a text, one after the other. Knows no calendar and no unit.
#pragma once
#include <optional>
#include <string>
#include <string_view>

#include "windrow/calendar/calendar.h"

namespace windrow::calendar {

std::string lower_case(std::string_view text);  ///< ASCII only, outer blanks dropped
std::string shortened(std::string_view text);   ///< for messages: at most 80 bytes, control characters as '?'

class Scanner {
 public:
  explicit Scanner(std::string_view text) : text_(text) {}
  [[nodiscard]] bool at_end() const { return pos_ == text_.size(); }
  [[nodiscard]] char peek() const { return at_end() ? '\0' : text_[pos_]; }
  void skip_blanks();
  bool accept(char c);  ///< steps over c if it comes next
  /// Letters, digits and underscores from a letter on, in lower case; empty when none comes next.
  std::string word();
  /// Unsigned decimal digits; nullopt when none comes next.
  std::optional<std::string_view> digits();
  /// Unsigned whole number of at most `max_digits` digits.
  std::optional<int> number(int max_digits);
  /// [+-]year-month-day with |year| <= kMaxYear, month 1..12, day 1..9999: the calendar decides about the day.
  std::optional<Date> date();

 private:
  std::string_view text_;
  std::size_t pos_ = 0;
};

}  // namespace windrow::calendar
