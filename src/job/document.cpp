#include "document.h"

#include <algorithm>
#include <utility>

namespace windrow::job {
namespace {

constexpr std::size_t kWindow = 100;  // characters of a long line that are shown

// Length of the UTF-8 sequence at `at`, 0 when it is broken.
std::size_t sequence_length(std::string_view text, std::size_t at) {
  const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(text[i]); };
  const unsigned char first = byte(at);
  const std::size_t length = first < 0x80                     ? 1
                             : first >= 0xC2 && first <= 0xDF ? 2
                             : first >= 0xE0 && first <= 0xEF ? 3
                             : first >= 0xF0 && first <= 0xF4 ? 4
                                                              : 0;
  if (length == 0 || at + length > text.size()) return 0;
  for (std::size_t i = 1; i < length; ++i)
    if ((byte(at + i) & 0xC0) != 0x80) return 0;
  return length;
}

// The characters of a line, each printable; a tab stays a tab.
std::vector<std::string> characters(std::string_view text) {
  std::vector<std::string> out;
  for (std::size_t i = 0; i < text.size();) {
    const std::size_t length = sequence_length(text, i);
    const auto first = static_cast<unsigned char>(text[i]);
    const bool control = length == 1 && (first < 0x20 || first == 0x7F) && first != '\t';
    out.emplace_back(length == 0 || control ? "?" : std::string(text.substr(i, length)));
    i += std::max<std::size_t>(length, 1);
  }
  return out;
}

}  // namespace

std::string printable(std::string_view text, std::size_t longest) {
  std::string out;
  for (const std::string& character : characters(text)) {
    if (out.size() + character.size() > longest) return out + "...";
    out += character == "\t" ? " " : character;
  }
  return out;
}

Document::Document(std::string name, std::string text, std::vector<std::string> overrides)
    : name_(std::move(name)), text_(std::move(text)), overrides_(std::move(overrides)) {}

std::string Document::place(Position at) const {
  if (at.origin > 0) return "--set " + printable(overrides_[static_cast<std::size_t>(at.origin - 1)], 200);
  if (at.line <= 0) return name_;
  return name_ + ":" + std::to_string(at.line) + ":" + std::to_string(at.column);
}

std::string_view Document::line(int number) const {
  std::string_view rest = text_;
  for (int i = 1; i < number; ++i) {
    const std::size_t end = rest.find('\n');
    if (end == std::string_view::npos) return {};
    rest.remove_prefix(end + 1);
  }
  rest = rest.substr(0, rest.find('\n'));
  if (!rest.empty() && rest.back() == '\r') rest.remove_suffix(1);
  return rest;
}

std::string Document::excerpt(Position at) const {
  if (at.origin > 0 || at.line <= 0) return {};
  std::vector<std::string> shown = characters(line(at.line));
  if (at.line == 1 && !shown.empty() && shown.front() == "\xEF\xBB\xBF") shown.erase(shown.begin());
  std::size_t caret = static_cast<std::size_t>(std::max(at.column, 1) - 1);
  caret = std::min(caret, shown.size());
  const std::size_t first = caret > kWindow * 3 / 4 ? caret - kWindow * 3 / 4 : 0;
  const std::size_t last = std::min(shown.size(), first + kWindow);
  std::string text, below;
  for (std::size_t i = first; i < last; ++i) text += shown[i];
  for (std::size_t i = first; i < caret; ++i) below += shown[i] == "\t" ? "\t" : " ";
  return text + "\n" + below + "^";
}

void Document::fail(Position at, const std::string& message) const {
  throw Error(Failure::job, place(at), message, excerpt(at));
}

}  // namespace windrow::job
