// Laws of comma-separated tables (RFC 4180).
#include <doctest/doctest.h>

#include <random>

#include "windrow/base/error.h"
#include "windrow/text/csv.h"

using namespace windrow;
using windrow::text::CsvTable;

namespace {

std::string refusal(std::string_view bytes) {
  try {
    CsvTable::parse(bytes, "s.csv");
  } catch (const Error& error) {
    CHECK(error.kind() == Failure::data);
    return error.what();
  }
  return "accepted";
}

}  // namespace

TEST_CASE("headings are split into name and unit, cells are trimmed, lines are counted") {
  const CsvTable table = CsvTable::parse(
      "\xef\xbb\xbfstation, date ,tas [degC],\"pr [mm/day]\"\r\n\r\nA,1981-01-01, 1.5 ,\r\nB,1981-01-02\r\n", "s.csv");
  REQUIRE(table.headings().size() == 4);
  CHECK(table.headings()[2].name == "tas");
  CHECK(table.headings()[2].units == "degC");
  CHECK(table.headings()[3].units == "mm/day");
  CHECK(table.headings()[1].name == "date");
  CHECK(table.headings()[1].units.empty());
  REQUIRE(table.rows() == 2);
  CHECK(table.at(0, 2) == "1.5");
  CHECK(table.at(0, 3).empty());
  CHECK(table.at(1, 3).empty());
  CHECK(table.at(1, 1) == "1981-01-02");
  CHECK(table.place(0) == "s.csv:3");
  CHECK(table.place(1) == "s.csv:4");
  CHECK(table.column("pr") == 3);
  CHECK(table.column("PR") == -1);
  CHECK(table.file() == "s.csv");
  CHECK_THROWS_AS((void)table.at(2, 0), Error);
}

TEST_CASE("a table put together by another reader is a table too, and says what its rows' numbers count") {
  CsvTable table = CsvTable::made("x.nc", {{"station", ""}, {"tas", "degC"}}, "time");
  CHECK(table.rows() == 0);
  table.add({"a, b", ""}, 7);
  table.add({"c", "1.5"}, 31);
  CHECK(table.rows() == 2);
  CHECK(table.at(0, 0) == "a, b");
  CHECK(table.at(0, 1).empty());
  CHECK(table.at(1, 1) == "1.5");
  CHECK(table.column("tas") == 1);
  CHECK(table.place(1) == "x.nc: time 31");
  CHECK(CsvTable::parse("a\n1\n", "x.csv").place(0) == "x.csv:2");
  CHECK_THROWS_AS(table.add({"one"}, 1), Error);
}

TEST_CASE("the header line decides about the separator") {
  CHECK(CsvTable::parse("a;b;c\n1,5;2;3\n", "").at(0, 0) == "1,5");
  CHECK(CsvTable::parse("a\tb\n1 2\t3\n", "").at(0, 0) == "1 2");
  CHECK(CsvTable::parse("\"a;b;c\",d\n1,2\n", "").headings()[0].name == "a;b;c");
  CHECK(CsvTable::parse("a\n1\n", "").rows() == 1);
  CHECK(CsvTable::parse("a\tb\tc\n\t\t3\n", "").at(0, 2) == "3");
}

TEST_CASE("quotes protect separators, line ends and quotes (RFC 4180, section 2)") {
  const CsvTable table = CsvTable::parse("name,note\n\"Kelder, Nord\" , \"two\nlines and \"\"quotes\"\"\"\nx,y", "");
  REQUIRE(table.rows() == 2);
  CHECK(table.at(0, 0) == "Kelder, Nord");
  CHECK(table.at(0, 1) == "two\nlines and \"quotes\"");
  CHECK(table.place(0) == ":2");
  CHECK(table.place(1) == ":4");
  CHECK(table.at(1, 1) == "y");
}

TEST_CASE("odd headings keep their text") {
  const CsvTable table = CsvTable::parse("tas[K],a [b] [c],[mm],x [],,\n", "");
  CHECK(table.headings()[0].name == "tas");
  CHECK(table.headings()[0].units == "K");
  CHECK(table.headings()[1].name == "a [b]");
  CHECK(table.headings()[1].units == "c");
  CHECK(table.headings()[2].name == "[mm]");
  CHECK(table.headings()[3].name == "x");
  CHECK(table.headings()[3].units.empty());
  CHECK(table.headings().size() == 6);
  CHECK(table.rows() == 0);
}

TEST_CASE("a malformed table is refused with file and line") {
  CHECK(refusal("") == "s.csv: the table is empty; expected a header line");
  CHECK(refusal("\n \n\r\n") == "s.csv: the table is empty; expected a header line");
  CHECK(refusal("a,b\n1,2,3\n") == "s.csv:2: 3 fields; expected at most 2 as in the header");
  CHECK(refusal("a,b\n1,2\n\"x,2\n3,4\n") == "s.csv:3: a quote is opened and never closed");
  CHECK(refusal("a,b\n1,2\nx\"y,2\n") == "s.csv:3: a quote inside a field that does not begin with one");
  CHECK(refusal("a,b\n\"x\"y,2\n") == "s.csv:2: text follows a closing quote; expected a separator");
  CHECK(refusal("a,b\r1,2\r") == "s.csv:1: a carriage return without line feed; expected lines that end in LF or CRLF");
  CHECK(refusal("a,tas [K],tas [degC]\n") == "s.csv:1: heading 'tas' stands twice");
  CHECK(refusal("a,b\nK\xf6ln,2\n") == "s.csv:2: byte 0xf6 is not UTF-8; expected a UTF-8 text");
  CHECK(refusal(std::string_view("a,b\n1,\0\n", 8)) == "s.csv:2: a NUL byte; expected a text");
  CHECK(refusal(std::string_view("\xff\xfe"
                                 "a\0",
                                 4)) == "s.csv: the text is UTF-16; expected UTF-8");
}

TEST_CASE("a table written by RFC 4180 reads back cell by cell") {
  std::mt19937_64 random(4180);
  const std::string alphabet[] = {"a", "Ö", ",", "\"", "\n", ";", "7", ".", "\r\n"};
  for (int round = 0; round < 500; ++round) {
    const std::size_t columns = 1 + random() % 5, rows = random() % 6;
    std::string bytes;
    for (std::size_t c = 0; c < columns; ++c) bytes += (c > 0 ? "," : "") + std::string("h") + std::to_string(c);
    std::vector<std::string> cells;
    for (std::size_t r = 0; r < rows; ++r) {
      bytes += "\r\n";
      for (std::size_t c = 0; c < columns; ++c) {
        std::string cell = "x";
        for (auto n = random() % 6; n > 0; --n) cell += alphabet[random() % std::size(alphabet)];
        cell += "x";
        std::string quoted = "\"";
        for (const char letter : cell) quoted += letter == '"' ? std::string("\"\"") : std::string(1, letter);
        bytes += (c > 0 ? "," : "") + quoted + "\"";
        cells.push_back(cell);
      }
    }
    const CsvTable table = CsvTable::parse(bytes, "s.csv");
    REQUIRE(table.rows() == rows);
    for (std::size_t i = 0; i < cells.size(); ++i) REQUIRE(table.at(i / columns, i % columns) == cells[i]);
  }
}

TEST_CASE("no bytes crash the reading of a table: they are read or refused") {
  std::mt19937_64 random(1981);
  const std::string pieces[] = {"a",
                                ",",
                                "\"",
                                "\n",
                                "\r\n",
                                "\r",
                                ";",
                                "\t",
                                " ",
                                "[",
                                "]",
                                "\xc3\xa4",
                                "\xff",
                                "1.5",
                                "\"\"",
                                std::string(1, '\0'),
                                "\xef\xbb\xbf",
                                "h,i\n"};
  int read = 0;
  for (int i = 0; i < 100'000; ++i) {
    std::string bytes = i % 2 == 0 ? "a,b,c\n" : "";
    for (auto n = random() % 12; n > 0; --n) bytes += pieces[random() % std::size(pieces)];
    try {
      const CsvTable table = CsvTable::parse(bytes, "fuzz");
      for (std::size_t r = 0; r < table.rows(); ++r) {
        for (std::size_t c = 0; c < table.headings().size(); ++c) (void)table.at(r, c).size();
      }
      ++read;
    } catch (const Error& error) {
      REQUIRE(error.kind() == Failure::data);
    }
  }
  CHECK(read > 1000);  // or the test would try refusals only
}
