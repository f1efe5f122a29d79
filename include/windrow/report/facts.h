// A tree of facts that is told to people as indented lines and to programs as JSON: one source for both.
#pragma once
#include <cstdint>
#include <string>
#include <utility>
#include <variant>
#include <vector>

namespace windrow::report {

/// A label with a value, or with further facts below it. `list`: children are entries of a JSON array.
struct Fact {
  std::string label;
  std::variant<std::monostate, std::string, double, std::int64_t, bool> value;
  std::vector<Fact> children;
  bool list = false;

  explicit Fact(std::string name) : label(std::move(name)) {}
  Fact(std::string name, std::string text) : label(std::move(name)), value(std::move(text)) {}
  Fact(std::string name, const char* text) : label(std::move(name)), value(std::string(text)) {}
  Fact(std::string name, double number) : label(std::move(name)), value(number) {}
  Fact(std::string name, std::int64_t number) : label(std::move(name)), value(number) {}
  Fact(std::string name, bool flag) : label(std::move(name)), value(flag) {}

  Fact& add(Fact child) {
    children.push_back(std::move(child));
    return children.back();
  }
};

/// Children of `root` as lines "label: value", two blanks deeper a level; ends with a newline.
std::string to_text(const Fact& root);
/// One JSON object; labels become keys with blanks turned into underscores.
std::string to_json(const Fact& root);

}  // namespace windrow::report
