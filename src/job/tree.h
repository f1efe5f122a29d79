// The job file as a plain tree of values with their places. Only toml_reader.cpp knows the TOML library.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "document.h"

namespace windrow::job {

struct Member;

struct Value {
  enum class Kind { table, array, text, whole, number, flag, date };
  Kind kind = Kind::table;
  std::string text;             ///< text and date: the value; of an override: always what was typed
  long long whole = 0;          ///< whole
  double number = 0;            ///< number, and whole as a number
  bool flag = false;            ///< flag
  std::vector<Member> members;  ///< table, in file order
  std::vector<Value> items;     ///< array
  bool table_array = false;     ///< written with [[...]]
  Position at;
};

struct Member {
  std::string key;
  Position at;
  Value value;
};

/// The tree of the document's text. Error(job) with the place of a syntax error.
Value read_toml(const Document& document);

/// Value of an override's text: TOML where it is TOML, plain text otherwise ("K", "out/new").
Value read_override_value(const std::string& text, int origin);

/// Puts the document's overrides (`dotted.path=value`; an index selects in an array) into the tree.
void apply_overrides(const Document& document, Value& root);

/// "text", "a whole number", ... for messages.
std::string kind_name(const Value& value);

}  // namespace windrow::job
