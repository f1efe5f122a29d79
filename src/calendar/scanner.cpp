// Scanner: the character level of dates and time units.
#include "scanner.h"

#include <charconv>

namespace windrow::calendar {
namespace {

bool is_blank(char c) { return c == ' ' || c == '\t' || c == '\n' || c == '\r'; }
bool is_digit(char c) { return c >= '0' && c <= '9'; }
char lower(char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; }
bool is_letter(char c) { return lower(c) >= 'a' && lower(c) <= 'z'; }

}  // namespace

std::string lower_case(std::string_view text) {
  while (!text.empty() && is_blank(text.front())) text.remove_prefix(1);
  while (!text.empty() && is_blank(text.back())) text.remove_suffix(1);
  std::string result(text);
  for (char& c : result) c = lower(c);
  return result;
}

std::string shortened(std::string_view text) {
  constexpr std::size_t kLongest = 80;
  std::string result(text.substr(0, kLongest));
  for (char& c : result) {
    if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f) c = '?';
  }
  return text.size() > kLongest ? result + "..." : result;
}

void Scanner::skip_blanks() {
  while (!at_end() && is_blank(text_[pos_])) ++pos_;
}

bool Scanner::accept(char c) {
  if (at_end() || text_[pos_] != c) return false;
  ++pos_;
  return true;
}

std::string Scanner::word() {
  std::string result;
  if (!is_letter(peek())) return result;
  while (is_letter(peek()) || is_digit(peek()) || peek() == '_') result += lower(text_[pos_++]);
  return result;
}

std::optional<std::string_view> Scanner::digits() {
  const std::size_t start = pos_;
  while (is_digit(peek())) ++pos_;
  if (pos_ == start) return std::nullopt;
  return text_.substr(start, pos_ - start);
}

std::optional<int> Scanner::number(int max_digits) {
  const auto run = digits();
  if (!run || run->size() > static_cast<std::size_t>(max_digits)) return std::nullopt;
  int value = 0;
  std::from_chars(run->data(), run->data() + run->size(), value);
  return value;
}

std::optional<Date> Scanner::date() {
  const bool negative = accept('-');
  if (!negative) accept('+');
  const auto year = number(6);
  if (!year || *year > kMaxYear || !accept('-')) return std::nullopt;
  const auto month = number(2);
  if (!month || *month < 1 || *month > 12 || !accept('-')) return std::nullopt;
  const auto day = number(4);
  if (!day || *day < 1) return std::nullopt;
  return Date{negative ? -*year : *year, *month, *day};
}

}  // namespace windrow::calendar
