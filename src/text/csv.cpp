// Reading comma-separated tables. Knows nothing of what the columns mean.
#include "windrow/text/csv.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>

#include "utf8.h"
#include "windrow/base/error.h"
#include "windrow/text/words.h"

namespace windrow::text {
namespace {

bool is_blank(char c) { return c == ' ' || c == '\t'; }

std::string_view without_blanks(std::string_view text) {
  while (!text.empty() && (is_blank(text.front()) || text.front() == '\n' || text.front() == '\r'))
    text.remove_prefix(1);
  while (!text.empty() && (is_blank(text.back()) || text.back() == '\n' || text.back() == '\r')) text.remove_suffix(1);
  return text;
}

/// Reads one record after the other. A record may span lines inside quotes.
class RecordReader {
 public:
  RecordReader(std::string_view bytes, const std::string& file) : bytes_(bytes), file_(file) {}

  [[nodiscard]] std::size_t line() const { return record_line_; }
  [[nodiscard]] Error error(std::size_t line, const std::string& text) const {
    return Error(Failure::data, fmt::format("{}:{}", file_, line), text);
  }

  /// The separator that the line at hand, outside quotes, has most of; a comma when it has none.
  [[nodiscard]] char separator_of_next_line() const {
    constexpr std::array<char, 3> kSeparators = {',', ';', '\t'};
    std::array<std::size_t, 3> counts{};
    bool quoted = false;
    for (std::size_t i = pos_; i < bytes_.size() && (quoted || bytes_[i] != '\n'); ++i) {
      if (bytes_[i] == '"') quoted = !quoted;
      for (std::size_t s = 0; s < 3; ++s) counts[s] += !quoted && bytes_[i] == kSeparators[s];
    }
    return kSeparators[static_cast<std::size_t>(std::max_element(counts.begin(), counts.end()) - counts.begin())];
  }

  void skip_blank_lines() {
    std::size_t i = pos_;
    while (i < bytes_.size()) {
      while (i < bytes_.size() && is_blank(bytes_[i])) ++i;
      if (i < bytes_.size() && bytes_[i] == '\r') ++i;
      if (i < bytes_.size() && bytes_[i] != '\n') return;
      if (i < bytes_.size()) ++i, ++line_;
      pos_ = i;
    }
  }

  /// Appends the fields of the next record's text to `text` and their ends to `ends`; false at the end of the bytes.
  bool next(char separator, std::string& text, std::vector<std::size_t>& ends) {
    if (pos_ == bytes_.size()) return false;
    record_line_ = line_;
    while (true) {
      field(separator, text);
      ends.push_back(text.size());
      if (pos_ == bytes_.size()) return true;
      if (bytes_[pos_] == separator) {
        ++pos_;
        continue;
      }
      pos_ += bytes_[pos_] == '\r' ? 2 : 1;
      ++line_;
      return true;
    }
  }

 private:
  /// At the end of a field: the separator, a line's end or the end of the bytes.
  [[nodiscard]] bool at_field_end(char separator) const {
    if (pos_ == bytes_.size() || bytes_[pos_] == separator || bytes_[pos_] == '\n') return true;
    if (bytes_[pos_] != '\r') return false;
    if (pos_ + 1 < bytes_.size() && bytes_[pos_ + 1] == '\n') return true;
    throw error(line_, "a carriage return without line feed; expected lines that end in LF or CRLF");
  }

  void skip_blanks(char separator) {
    while (pos_ < bytes_.size() && is_blank(bytes_[pos_]) && bytes_[pos_] != separator) ++pos_;
  }

  void field(char separator, std::string& text) {
    skip_blanks(separator);
    if (pos_ < bytes_.size() && bytes_[pos_] == '"') return quoted_field(separator, text);
    const std::size_t start = pos_;
    while (!at_field_end(separator)) {
      if (bytes_[pos_] == '"') throw error(line_, "a quote inside a field that does not begin with one");
      ++pos_;
    }
    text += without_blanks(bytes_.substr(start, pos_ - start));
  }

  void quoted_field(char separator, std::string& text) {
    const std::size_t opened = line_;
    std::string value;
    for (++pos_;; ++pos_) {
      if (pos_ == bytes_.size()) throw error(opened, "a quote is opened and never closed");
      const char c = bytes_[pos_];
      if (c == '"') {
        if (pos_ + 1 == bytes_.size() || bytes_[pos_ + 1] != '"') break;
        ++pos_;
      }
      line_ += c == '\n';
      value += c;
    }
    ++pos_;
    skip_blanks(separator);
    if (!at_field_end(separator)) throw error(line_, "text follows a closing quote; expected a separator");
    text += without_blanks(value);
  }

  std::string_view bytes_;
  const std::string& file_;
  std::size_t pos_ = 0, line_ = 1, record_line_ = 1;
};

/// "tas [degC]" -> "tas", "degC". Without a name before the bracket the whole text is the name.
Heading heading_of(const std::string& text) {
  const std::size_t open = text.rfind('[');
  if (text.empty() || text.back() != ']' || open == std::string::npos) return {text, {}};
  std::string name = trimmed(std::string_view(text).substr(0, open));
  if (name.empty()) return {text, {}};
  return {std::move(name), trimmed(std::string_view(text).substr(open + 1, text.size() - open - 2))};
}

void check_bytes(std::string_view bytes, const std::string& file) {
  const auto line_of = [&](std::size_t at) { return std::count(bytes.begin(), bytes.begin() + at, '\n') + 1; };
  if (bytes.substr(0, 2) == "\xff\xfe" || bytes.substr(0, 2) == "\xfe\xff") {
    throw Error(Failure::data, file, "the text is UTF-16; expected UTF-8");
  }
  if (const std::size_t bad = first_not_utf8(bytes); bad != std::string_view::npos) {
    throw Error(
        Failure::data, fmt::format("{}:{}", file, line_of(bad)),
        fmt::format("byte 0x{:02x} is not UTF-8; expected a UTF-8 text", static_cast<unsigned char>(bytes[bad])));
  }
  if (const std::size_t nul = bytes.find('\0'); nul != std::string_view::npos) {
    throw Error(Failure::data, fmt::format("{}:{}", file, line_of(nul)), "a NUL byte; expected a text");
  }
}

}  // namespace

CsvTable CsvTable::parse(std::string_view bytes, const std::string& file) {
  check_bytes(bytes, file);
  if (bytes.substr(0, 3) == "\xef\xbb\xbf") bytes.remove_prefix(3);
  CsvTable table;
  table.file_ = file;
  RecordReader reader(bytes, table.file_);
  reader.skip_blank_lines();
  const char separator = reader.separator_of_next_line();

  std::string header;
  std::vector<std::size_t> header_ends;
  if (!reader.next(separator, header, header_ends)) {
    throw Error(Failure::data, file, "the table is empty; expected a header line");
  }
  std::size_t start = 0;
  for (const std::size_t end : header_ends) {
    Heading heading = heading_of(header.substr(start, end - start));
    start = end;
    if (!heading.name.empty() && table.column(heading.name) >= 0) {
      throw reader.error(reader.line(), fmt::format("heading '{}' stands twice", heading.name));
    }
    table.headings_.push_back(std::move(heading));
  }

  const std::size_t columns = table.headings_.size();
  for (reader.skip_blank_lines(); reader.next(separator, table.text_, table.ends_); reader.skip_blank_lines()) {
    const std::size_t fields = table.ends_.size() - table.lines_.size() * columns;
    if (fields > columns) {
      throw reader.error(reader.line(),
                         fmt::format("{} fields; expected at most {} as in the header", fields, columns));
    }
    table.lines_.push_back(reader.line());
    table.ends_.resize(table.lines_.size() * columns, table.text_.size());
  }
  return table;
}

CsvTable CsvTable::made(const std::string& file, std::vector<Heading> headings, std::string counted) {
  CsvTable table;
  table.file_ = file;
  table.headings_ = std::move(headings);
  table.counted_ = std::move(counted);
  return table;
}

void CsvTable::add(const std::vector<std::string>& cells, std::size_t number) {
  if (cells.size() != headings_.size()) throw Error(Failure::defect, file_, "a row of another width");
  for (const std::string& cell : cells) {
    text_ += cell;
    ends_.push_back(text_.size());
  }
  lines_.push_back(number);
}

std::string CsvTable::place(std::size_t row) const {
  return counted_.empty() ? fmt::format("{}:{}", file_, lines_[row])
                          : fmt::format("{}: {} {}", file_, counted_, lines_[row]);
}

std::string_view CsvTable::at(std::size_t row, std::size_t column) const {
  const std::size_t cell = row * headings_.size() + column;
  if (row >= rows() || column >= headings_.size()) throw Error(Failure::defect, file_, "no such cell");
  const std::size_t start = cell == 0 ? 0 : ends_[cell - 1];
  return std::string_view(text_).substr(start, ends_[cell] - start);
}

int CsvTable::column(std::string_view name) const {
  for (std::size_t i = 0; i < headings_.size(); ++i) {
    if (headings_[i].name == name) return static_cast<int>(i);
  }
  return -1;
}

}  // namespace windrow::text
