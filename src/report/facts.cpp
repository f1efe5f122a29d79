#include "windrow/report/facts.h"

#include <fmt/format.h>

#include <algorithm>
#include <nlohmann/json.hpp>

namespace windrow::report {
namespace {

using Json = nlohmann::ordered_json;

std::string text_of(const Fact& fact) {
  if (const auto* text = std::get_if<std::string>(&fact.value)) return *text;
  if (const auto* number = std::get_if<double>(&fact.value)) return fmt::format("{:.6g}", *number);
  if (const auto* number = std::get_if<std::int64_t>(&fact.value)) return fmt::format("{}", *number);
  if (const auto* flag = std::get_if<bool>(&fact.value)) return *flag ? "yes" : "no";
  return {};
}

void add_lines(const Fact& fact, std::size_t depth, std::string& out) {
  for (const auto& child : fact.children) {
    const std::string value = text_of(child);
    out += fmt::format("{:{}}{}{}{}\n", "", depth * 2, child.label, value.empty() && child.children.empty() ? "" : ":",
                       value.empty() ? "" : " " + value);
    add_lines(child, depth + 1, out);
  }
}

Json json_of(const Fact& fact) {
  if (fact.list) {
    Json out = Json::array();
    for (const auto& child : fact.children) out.push_back(json_of(child));
    return out;
  }
  if (!fact.children.empty()) {
    Json out = Json::object();
    if (!std::holds_alternative<std::monostate>(fact.value)) out["value"] = text_of(fact);
    for (const auto& child : fact.children) {
      std::string key = child.label;
      std::replace(key.begin(), key.end(), ' ', '_');
      out[key] = json_of(child);
    }
    return out;
  }
  return std::visit(
      [](const auto& value) -> Json {
        if constexpr (std::is_same_v<std::decay_t<decltype(value)>, std::monostate>) {
          return nullptr;
        } else {
          return value;
        }
      },
      fact.value);
}

}  // namespace

std::string to_text(const Fact& root) {
  std::string out;
  add_lines(root, 0, out);
  return out;
}

std::string to_json(const Fact& root) {
  return json_of(root).dump(1, ' ', false, Json::error_handler_t::replace) + "\n";
}

}  // namespace windrow::report
