// The job file's text and how to point at a place in it. Knows nothing of TOML or of keys.
#pragma once
#include <string>
#include <string_view>
#include <vector>

#include "windrow/base/error.h"

namespace windrow::job {

/// A place a value comes from: line and column count from 1 (columns in characters). Line 0: no place in the file.
/// `origin` 0 is the job file, n the n-th override of the command line.
struct Position {
  int line = 0, column = 0;
  int origin = 0;
};

class Document {
 public:
  Document(std::string name, std::string text, std::vector<std::string> overrides);

  [[nodiscard]] const std::string& name() const { return name_; }
  [[nodiscard]] const std::string& text() const { return text_; }
  [[nodiscard]] const std::vector<std::string>& overrides() const { return overrides_; }

  /// `FILE:LINE:COLUMN`, `--set KEY=VALUE` for an override, `FILE` without a line.
  [[nodiscard]] std::string place(Position at) const;
  /// The line and a caret below it, two lines; empty where there is no line. Long lines are cut to a window.
  [[nodiscard]] std::string excerpt(Position at) const;
  /// Error(job) at that place, with the excerpt as detail.
  [[noreturn]] void fail(Position at, const std::string& message) const;

 private:
  [[nodiscard]] std::string_view line(int number) const;

  std::string name_, text_;
  std::vector<std::string> overrides_;
};

/// Text from a file made fit for one line of a message: control characters and broken UTF-8 become '?', long texts are
/// cut to `longest` bytes.
std::string printable(std::string_view text, std::size_t longest = 80);

}  // namespace windrow::job
