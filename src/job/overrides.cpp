// Overrides of single job-file keys from the command line, put into the tree before it is read.
#include <algorithm>
#include <cctype>

#include "tree.h"

namespace windrow::job {
namespace {

std::vector<std::string> split_path(const std::string& path) {
  std::vector<std::string> parts(1);
  for (const char c : path) {
    if (c == '.')
      parts.emplace_back();
    else
      parts.back() += c;
  }
  return parts;
}

bool is_index(const std::string& part) {
  return !part.empty() && part.size() <= 6 &&
         std::all_of(part.begin(), part.end(), [](unsigned char c) { return std::isdigit(c) != 0; });
}

Value& child(Value& node, const std::string& part, const std::string& so_far, const Document& document, Position at) {
  if (node.kind == Value::Kind::array) {
    const std::size_t count = node.items.size();
    const std::string range = count == 0 ? "it is empty" : "expected an index from 0 to " + std::to_string(count - 1);
    if (!is_index(part))
      document.fail(at, "'" + so_far + "' is an array, and '" + printable(part) + "' is no index in it; " + range);
    const auto index = static_cast<std::size_t>(std::stoul(part));
    if (index >= count) document.fail(at, "'" + so_far + "' has no entry " + part + "; " + range);
    return node.items[index];
  }
  if (node.kind != Value::Kind::table)
    document.fail(at, "'" + so_far + "' is " + kind_name(node) + " and has no keys; expected a key of the job file");
  for (Member& member : node.members)
    if (member.key == part) return member.value;
  Member added{part, at, {}};
  added.value.at = at;
  node.members.push_back(std::move(added));
  return node.members.back().value;
}

// Marks all of an overridden value's keys as coming from the override.
void place(Value& value, Position at) {
  value.at = at;
  for (Member& member : value.members) {
    member.at = at;
    place(member.value, at);
  }
  for (Value& item : value.items) place(item, at);
}

}  // namespace

void apply_overrides(const Document& document, Value& root) {
  for (std::size_t i = 0; i < document.overrides().size(); ++i) {
    const std::string& text = document.overrides()[i];
    const Position at{0, 0, static_cast<int>(i + 1)};
    const std::size_t equals = text.find('=');
    if (equals == std::string::npos || equals == 0)
      document.fail(at, "no key and value; expected KEY=VALUE with the dotted path of a job-file key");
    const std::vector<std::string> path = split_path(text.substr(0, equals));
    Value* node = &root;
    std::string so_far;
    for (const std::string& part : path) {
      if (part.empty()) document.fail(at, "an empty part in the dotted path; expected a path such as field.0.units");
      if (part.size() > 200 || path.size() > 20) document.fail(at, "the dotted path is too long");
      node = &child(*node, part, so_far, document, at);
      so_far += (so_far.empty() ? "" : ".") + printable(part);
    }
    *node = read_override_value(text.substr(equals + 1), static_cast<int>(i + 1));
    place(*node, at);
  }
}

}  // namespace windrow::job
