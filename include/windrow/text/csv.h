// Comma-separated tables (RFC 4180; also semicolon or tab, decided by the header line). UTF-8, BOM dropped, CRLF allowed.
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

/// A whole table in memory. Error(data) names file and line: unbalanced quote, a row with too many fields, no header.
class CsvTable {
 public:
  static CsvTable parse(std::string_view bytes, const std::string& file);
  [[nodiscard]] const std::vector<Heading>& headings() const { return headings_; }
  [[nodiscard]] std::size_t rows() const { return lines_.size(); }
  [[nodiscard]] std::string_view at(std::size_t row, std::size_t column) const;  ///< trimmed; empty when absent
  [[nodiscard]] std::size_t line(std::size_t row) const { return lines_[row]; }  ///< 1-based line in the file
  [[nodiscard]] int column(std::string_view name) const;                         ///< -1 when there is none
  [[nodiscard]] const std::string& file() const { return file_; }

 private:
  std::string file_;
  std::vector<Heading> headings_;
  std::vector<std::string> cells_;
  std::vector<std::size_t> lines_;
};

}  // namespace windrow::text
