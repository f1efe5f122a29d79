// A cursor over one table of the job file: typed values with their places, unknown keys refused at once.
#pragma once
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "tree.h"

namespace windrow::job {

/// The keys a table has in this version, and those that the job file's description names but this version does not do.
struct Keys {
  std::vector<std::string> known;
  std::vector<std::string> later;
};

/// Words a key takes: each with its value; `later` are known words that this version does not do.
template <class E>
struct Words {
  std::vector<std::pair<std::string, E>> known;
  std::vector<std::string> later;
};

class Table {
 public:
  /// `title` names the table in messages: "[mesh]", "[[field]]", "'lon' of [mesh]". Error(job) at the first key that is
  /// not among `keys`. `document` and `value` outlive the cursor.
  Table(const Document& document, const Value& value, std::string title, const Keys& keys);

  [[nodiscard]] const Document& document() const { return *document_; }
  [[nodiscard]] const std::string& title() const { return title_; }
  [[nodiscard]] Position at() const { return value_->at; }
  [[nodiscard]] bool has(const std::string& key) const { return find(key) != nullptr; }
  [[nodiscard]] const Value* find(const std::string& key) const;
  /// Place of a key's value; the table's own where the key is absent.
  [[nodiscard]] Position at(const std::string& key) const;

  [[nodiscard]] std::optional<std::string> text(const std::string& key) const;
  [[nodiscard]] std::string text(const std::string& key, const std::string& otherwise) const;
  /// Finite, within low..high.
  [[nodiscard]] std::optional<double> number(const std::string& key, double low, double high) const;
  [[nodiscard]] double number(const std::string& key, double otherwise, double low, double high) const;
  [[nodiscard]] int whole(const std::string& key, int otherwise, int low, int high) const;
  [[nodiscard]] std::optional<bool> flag(const std::string& key) const;
  /// A text or an array of texts, each with its place. Empty only when the key is absent.
  [[nodiscard]] std::vector<std::pair<std::string, Position>> texts(const std::string& key) const;
  /// An array of exactly `count` finite numbers.
  [[nodiscard]] std::optional<std::vector<double>> numbers(const std::string& key, std::size_t count) const;
  /// The members of a table whose values are texts, in file order.
  [[nodiscard]] std::vector<std::pair<std::string, std::string>> text_table(const std::string& key) const;
  /// Expanded, absolute path or paths.
  [[nodiscard]] std::string path(const std::string& key) const;
  [[nodiscard]] std::vector<std::string> paths(const std::string& key) const;
  [[nodiscard]] std::optional<Table> table(const std::string& key, const std::string& title, const Keys& keys) const;

  template <class E>
  E word(const std::string& key, const Words<E>& words, E otherwise) const {
    const std::optional<std::string> found = text(key);
    if (!found) return otherwise;
    std::vector<std::string> names;
    for (const auto& [name, value] : words.known) {
      if (name == *found) return value;
      names.push_back(name);
    }
    refuse_word(key, *found, names, words.later);
  }

  [[noreturn]] void fail(const std::string& key, const std::string& message) const;
  /// `[[field]] has no 'variable'; expected ...`
  [[noreturn]] void missing(const std::string& key, const std::string& expected) const;
  [[noreturn]] void wrong_kind(const std::string& key, const Value& found, const std::string& expected) const;

 private:
  [[noreturn]] void refuse_word(const std::string& key, const std::string& word, const std::vector<std::string>& known,
                                const std::vector<std::string>& later) const;
  void check_range(const std::string& key, double value, double low, double high) const;

  const Document* document_;
  const Value* value_;
  std::string title_;
};

}  // namespace windrow::job
