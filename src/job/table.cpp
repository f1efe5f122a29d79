#include "table.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "paths.h"
#include "windrow/text/words.h"

namespace windrow::job {
namespace {

bool contains(const std::vector<std::string>& words, const std::string& word) {
  return std::find(words.begin(), words.end(), word) != words.end();
}

// "; did you mean 'x'?" or "; expected a, b or c"
std::string suggestion(const std::string& word, const std::vector<std::string>& known) {
  const std::string nearest = text::nearest_word(word, known);
  return nearest.empty() ? "; expected " + text::alternatives(known) : "; did you mean '" + nearest + "'?";
}

}  // namespace

Table::Table(const Document& document, const Value& value, std::string title, const Keys& keys)
    : document_(&document), value_(&value), title_(std::move(title)) {
  for (const Member& member : value.members) {
    if (contains(keys.known, member.key)) continue;
    const bool is_table = member.value.kind == Value::Kind::table || member.value.table_array;
    if (contains(keys.later, member.key))
      document.fail(member.at,
                    fmt::format("{}'{}' is not in this version; leave it out", is_table ? "table " : "", member.key));
    const std::string unknown =
        fmt::format("unknown {} '{}' in {}", is_table ? "table" : "key", printable(member.key), title_);
    // A near miss of a key to come is told as such, rather than as a near miss of something else.
    const std::string later = text::nearest_word(member.key, keys.later);
    if (!later.empty() && text::nearest_word(member.key, keys.known).empty())
      document.fail(member.at, fmt::format("{}; '{}' is not in this version; leave it out", unknown, later));
    document.fail(member.at, unknown + suggestion(member.key, keys.known));
  }
}

const Value* Table::find(const std::string& key) const {
  for (const Member& member : value_->members)
    if (member.key == key) return &member.value;
  return nullptr;
}

Position Table::at(const std::string& key) const {
  const Value* value = find(key);
  return value == nullptr ? value_->at : value->at;
}

void Table::fail(const std::string& key, const std::string& message) const { document_->fail(at(key), message); }

void Table::missing(const std::string& key, const std::string& expected) const {
  document_->fail(value_->at, fmt::format("{} has no '{}'; expected {}", title_, key, expected));
}

void Table::wrong_kind(const std::string& key, const Value& found, const std::string& expected) const {
  document_->fail(found.at, fmt::format("'{}' is {}; expected {}", key, kind_name(found), expected));
}

void Table::refuse_word(const std::string& key, const std::string& word, const std::vector<std::string>& known,
                        const std::vector<std::string>& later) const {
  if (contains(later, word))
    fail(key, fmt::format("'{}' is not in this version; expected {}", word, text::alternatives(known)));
  fail(key, fmt::format("unknown {} '{}'{}", key, printable(word), suggestion(word, known)));
}

std::optional<std::string> Table::text(const std::string& key) const {
  const Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  // What an override says needs no quotes: --set job.version=2
  const bool from_override =
      value->at.origin > 0 && value->kind != Value::Kind::table && value->kind != Value::Kind::array;
  if (value->kind != Value::Kind::text && !from_override) wrong_kind(key, *value, "text in quotes");
  if (value->text.find('\0') != std::string::npos) fail(key, fmt::format("'{}' holds a null character", key));
  return value->text;
}

std::string Table::text(const std::string& key, const std::string& otherwise) const {
  return text(key).value_or(otherwise);
}

void Table::check_range(const std::string& key, double value, double low, double high) const {
  if (!std::isfinite(value)) fail(key, fmt::format("'{}' is not a finite number; expected {} to {}", key, low, high));
  if (value < low || value > high) fail(key, fmt::format("'{}' is {}; expected {} to {}", key, value, low, high));
}

std::optional<double> Table::number(const std::string& key, double low, double high) const {
  const Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  if (value->kind != Value::Kind::number && value->kind != Value::Kind::whole) wrong_kind(key, *value, "a number");
  check_range(key, value->number, low, high);
  return value->number;
}

double Table::number(const std::string& key, double otherwise, double low, double high) const {
  return number(key, low, high).value_or(otherwise);
}

int Table::whole(const std::string& key, int otherwise, int low, int high) const {
  const Value* value = find(key);
  if (value == nullptr) return otherwise;
  if (value->kind != Value::Kind::whole) wrong_kind(key, *value, "a whole number");
  if (value->whole < low || value->whole > high)
    fail(key, fmt::format("'{}' is {}; expected {} to {}", key, value->whole, low, high));
  return static_cast<int>(value->whole);
}

std::optional<bool> Table::flag(const std::string& key) const {
  const Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  if (value->kind != Value::Kind::flag) wrong_kind(key, *value, "true or false");
  return value->flag;
}

std::vector<std::pair<std::string, Position>> Table::texts(const std::string& key) const {
  const Value* value = find(key);
  if (value == nullptr) return {};
  if (value->kind != Value::Kind::array) {
    if (value->kind != Value::Kind::text && value->at.origin == 0)
      wrong_kind(key, *value, "text in quotes or an array of texts");
    return {{*text(key), value->at}};
  }
  if (value->items.empty()) fail(key, fmt::format("'{}' is empty; expected at least one entry", key));
  std::vector<std::pair<std::string, Position>> out;
  for (const Value& item : value->items) {
    if (item.kind != Value::Kind::text && item.kind != Value::Kind::date)
      document_->fail(item.at, fmt::format("an entry of '{}' is {}; expected text in quotes", key, kind_name(item)));
    if (item.text.find('\0') != std::string::npos)
      document_->fail(item.at, fmt::format("an entry of '{}' holds a null character", key));
    out.emplace_back(item.text, item.at);
  }
  return out;
}

std::optional<std::vector<double>> Table::numbers(const std::string& key, std::size_t count) const {
  const Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  const std::string expected = fmt::format("an array of {} numbers", count);
  if (value->kind != Value::Kind::array) wrong_kind(key, *value, expected);
  if (value->items.size() != count)
    fail(key, fmt::format("'{}' has {} {}; expected {}", key, value->items.size(),
                          value->items.size() == 1 ? "entry" : "entries", expected));
  std::vector<double> out;
  for (const Value& item : value->items) {
    const bool is_number = item.kind == Value::Kind::number || item.kind == Value::Kind::whole;
    if (!is_number || !std::isfinite(item.number))
      document_->fail(item.at, fmt::format("an entry of '{}' is {}; expected a finite number", key, kind_name(item)));
    out.push_back(item.number);
  }
  return out;
}

std::vector<std::pair<std::string, std::string>> Table::text_table(const std::string& key) const {
  const Value* value = find(key);
  if (value == nullptr) return {};
  if (value->kind != Value::Kind::table)
    wrong_kind(key, *value, fmt::format("a table such as {} = {{ name = \"text\" }}", key));
  std::vector<std::pair<std::string, std::string>> out;
  for (const Member& member : value->members) {
    if (member.value.kind != Value::Kind::text)
      document_->fail(member.value.at, fmt::format("'{}' of '{}' is {}; expected text in quotes", printable(member.key),
                                                   key, kind_name(member.value)));
    if ((member.key + member.value.text).find('\0') != std::string::npos)
      document_->fail(member.at, fmt::format("'{}' holds a null character", key));
    out.emplace_back(member.key, member.value.text);
  }
  return out;
}

std::string Table::path(const std::string& key) const {
  const std::optional<std::string> written = text(key);
  return written ? expanded_path(*document_, *written, at(key), key) : std::string();
}

std::vector<std::string> Table::paths(const std::string& key) const {
  std::vector<std::string> out;
  for (const auto& [written, position] : texts(key)) out.push_back(expanded_path(*document_, written, position, key));
  return out;
}

std::optional<Table> Table::table(const std::string& key, const std::string& title, const Keys& keys) const {
  const Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  if (value->kind == Value::Kind::array && value->table_array)
    document_->fail(value->at, fmt::format("{} is written as an array of tables; expected {} once", title, title));
  if (value->kind != Value::Kind::table) {
    std::string example;
    for (const std::string& name : keys.known) example += (example.empty() ? "" : ", ") + name + " = ...";
    const std::string form = title.front() == '[' ? "the table " + title : fmt::format("{} = {{ {} }}", key, example);
    wrong_kind(key, *value, form);
  }
  return Table(*document_, *value, title, keys);
}

}  // namespace windrow::job
