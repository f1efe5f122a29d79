// Comma-separated tables (RFC 4180; also semicolon or tab, decided by the header line). UTF-8, BOM dropped, CRLF
// allowed. Readers of other formats put their texts into the same table, so that nothing after them differs.
#pragma once
#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace windrow::text {

struct Heading {
  std::string name;   ///< "tas"
  std::string units;  ///< "degC" of "tas [degC]"; empty when there is no bracket
};

/// A whole table in memory. The separator is the one of comma, semicolon and tab that the header line has most of.
/// Blank lines are passed over; a row may have fewer fields than the header. Blanks around a field or its quotes drop.
/// Error(data) names file and line: no header, a heading (name) twice, a quote not closed, inside an unquoted field or
/// followed by text, a carriage return without line feed outside quotes, a row with too many fields, bytes that are not
/// UTF-8, a NUL.
class CsvTable {
 public:
  static CsvTable parse(std::string_view bytes, const std::string& file);
  /// An empty table to add rows to; `counted` says what the rows' numbers count in the file ("time", "obs").
  static CsvTable made(const std::string& file, std::vector<Heading> headings, std::string counted);
  /// One cell a heading, taken as they are; `number`: 1-based, for place().
  void add(const std::vector<std::string>& cells, std::size_t number);
  [[nodiscard]] const std::vector<Heading>& headings() const { return headings_; }
  [[nodiscard]] std::size_t rows() const { return lines_.size(); }
  [[nodiscard]] std::string_view at(std::size_t row, std::size_t column) const;  ///< trimmed; empty when absent
  [[nodiscard]] std::string place(std::size_t row) const;  ///< "file:line", or "file: time 31" of a table put together
  [[nodiscard]] int column(std::string_view name) const;   ///< exact name; -1 when there is none
  [[nodiscard]] const std::string& file() const { return file_; }

 private:
  std::string file_;
  std::string counted_;  // what lines_ counts; empty: lines
  std::vector<Heading> headings_;
  std::string text_;               // all cells of all rows, one after the other
  std::vector<std::size_t> ends_;  // end of each cell in text_, row by row, padded to the header's width
  std::vector<std::size_t> lines_;
};

}  // namespace windrow::text
