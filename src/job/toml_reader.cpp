// The only includer of the TOML library: turns its nodes into the plain tree of tree.h.
#define TOML_ENABLE_FORMATTERS 0
// The library asserts, or tells the compiler to assume, that a table header goes on with a key, which a damaged file
// breaks ("[=]"); the branch right behind the assertion refuses it in words. So neither may be compiled in.
#undef NDEBUG
#define TOML_ASSERT(expr) static_assert(true)
#include <toml++/toml.h>

#include <algorithm>
#include <sstream>

#include "tree.h"

namespace windrow::job {
namespace {

// Nesting through dotted keys is as deep as a line is long, and trees are walked and destroyed recursively.
constexpr std::size_t kLongestLine = 8192;

Position position(const toml::source_region& region, int origin) {
  return {static_cast<int>(region.begin.line), static_cast<int>(region.begin.column), origin};
}

bool earlier(const Member& a, const Member& b) {
  return a.at.line != b.at.line ? a.at.line < b.at.line : a.at.column < b.at.column;
}

Value converted(const toml::node& node, int origin);

Value converted_table(const toml::table& table, int origin) {
  Value out;
  for (const auto& [key, node] : table) {
    Member member{std::string(key.str()), position(key.source(), origin), converted(node, origin)};
    if (member.at.line == 0) member.at = member.value.at;
    out.members.push_back(std::move(member));
  }
  std::stable_sort(out.members.begin(), out.members.end(), earlier);
  return out;
}

Value converted(const toml::node& node, int origin) {
  Value out;
  if (const toml::table* table = node.as_table()) {
    out = converted_table(*table, origin);
  } else if (const toml::array* array = node.as_array()) {
    out.kind = Value::Kind::array;
    for (const toml::node& item : *array) out.items.push_back(converted(item, origin));
    const toml::table* first = array->empty() ? nullptr : array->front().as_table();
    out.table_array = first != nullptr && !first->is_inline();
  } else if (const auto* text = node.as_string()) {
    out.kind = Value::Kind::text;
    out.text = text->get();
  } else if (const auto* whole = node.as_integer()) {
    out.kind = Value::Kind::whole;
    out.whole = whole->get();
    out.number = static_cast<double>(whole->get());
  } else if (const auto* number = node.as_floating_point()) {
    out.kind = Value::Kind::number;
    out.number = number->get();
  } else if (const auto* flag = node.as_boolean()) {
    out.kind = Value::Kind::flag;
    out.flag = flag->get();
  } else {
    out.kind = Value::Kind::date;
    std::ostringstream written;
    if (const auto* date = node.as_date()) written << date->get();
    if (const auto* time = node.as_time()) written << time->get();
    if (const auto* both = node.as_date_time()) written << both->get();
    out.text = written.str();
  }
  out.at = position(node.source(), origin);
  return out;
}

void check_line_lengths(const Document& document) {
  const std::string& text = document.text();
  int line = 1;
  for (std::size_t begin = 0; begin <= text.size(); ++line) {
    const std::size_t end = std::min(text.find('\n', begin), text.size());
    if (end - begin > kLongestLine)
      document.fail({line, 1, 0}, "the line has " + std::to_string(end - begin) + " bytes; expected at most " +
                                      std::to_string(kLongestLine) + ": break it up");
    begin = end + 1;
  }
}

}  // namespace

Value read_toml(const Document& document) {
  check_line_lengths(document);
  try {
    return converted_table(toml::parse(document.text()), 0);
  } catch (const toml::parse_error& error) {
    constexpr std::string_view kOpening = "Error while parsing ";
    std::string_view description = error.description();
    if (description.starts_with(kOpening)) description.remove_prefix(kOpening.size());
    // The end of the line is the control character that is met in practice.
    if (description.starts_with("string: unescaped control character"))
      description = "string: expected the closing quote on the same line";
    document.fail(position(error.source(), 0), "not valid TOML: " + printable(description, 300));
  }
}

Value read_override_value(const std::string& text, int origin) {
  Value plain;
  plain.kind = Value::Kind::text;
  plain.at.origin = origin;
  if (text.size() <= kLongestLine) {
    try {
      const toml::table table = toml::parse("value = " + text);
      const toml::node* node = table.get("value");
      if (table.size() == 1 && node != nullptr) plain = converted(*node, origin);
    } catch (const toml::parse_error&) {
      // Not TOML: a plain word such as K or out/new, taken as it stands.
    }
  }
  if (plain.kind != Value::Kind::text || plain.text.empty()) plain.text = text;
  return plain;
}

std::string kind_name(const Value& value) {
  switch (value.kind) {
    case Value::Kind::table:
      return "a table";
    case Value::Kind::array:
      return value.table_array ? "an array of tables" : "an array";
    case Value::Kind::text:
      return "text";
    case Value::Kind::whole:
      return "a whole number";
    case Value::Kind::number:
      return "a number";
    case Value::Kind::flag:
      return "true or false";
    case Value::Kind::date:
      return "a date";
  }
  return {};
}

}  // namespace windrow::job
