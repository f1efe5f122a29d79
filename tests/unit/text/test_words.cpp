// Laws of near misses, numbers, durations and sizes.
#include <doctest/doctest.h>

#include <limits>
#include <random>

#include "windrow/text/words.h"

using namespace windrow::text;

TEST_CASE("a misspelt word finds its neighbour, a strange one none") {
  const std::vector<std::string> methods = {"mean-shift", "quantile-mapping", "quantile-delta-mapping", "none"};
  CHECK(nearest_word("quantile-maping", methods) == "quantile-mapping");
  CHECK(nearest_word("quantile-detla-mapping", methods) == "quantile-delta-mapping");
  CHECK(nearest_word("Mean-Shift", methods) == "mean-shift");
  CHECK(nearest_word("nnoe", methods) == "none");
  CHECK(nearest_word("kriging", methods).empty());
  CHECK(nearest_word("", methods).empty());
  CHECK(nearest_word("tas", {"tos", "tas"}) == "tas");
  CHECK(nearest_word("tsa", {"pr", "tas"}) == "tas");  // neighbours swapped count once
  CHECK(nearest_word("ab", {"cd"}).empty());
  CHECK(nearest_word("x", {}).empty());
}

TEST_CASE("alternatives are listed as in a sentence") {
  CHECK(alternatives({}).empty());
  CHECK(alternatives({"a"}) == "a");
  CHECK(alternatives({"a", "b"}) == "a or b");
  CHECK(alternatives({"a", "b", "c"}) == "a, b or c");
}

TEST_CASE("a number is the whole text, finite, with a point") {
  CHECK(parse_number(" -6.5 ") == -6.5);
  CHECK(parse_number("+1e-3") == 1e-3);
  CHECK(parse_number(".5") == 0.5);
  for (const char* text :
       {"", " ", "1,5", "1.5x", "nan", "inf", "-inf", "1e999", "0x10", "+-1", "--1", "1 2", "NA", "+"}) {
    CAPTURE(text);
    CHECK_FALSE(parse_number(text));
  }
}

TEST_CASE("sizes count in 1000 or 1024 as their unit says") {
  CHECK(parse_bytes("4 GiB") == std::int64_t{4} << 30);
  CHECK(parse_bytes("512MiB") == 512 << 20);
  CHECK(parse_bytes("1 GB") == 1'000'000'000);
  CHECK(parse_bytes("1000") == 1000);
  CHECK(parse_bytes("1.5 KiB") == 1536);
  for (const char* text : {"", "GiB", "-1", "4 G", "4 GiB x", "1e30", "9000000 TiB", "nan"})
    CHECK_FALSE(parse_bytes(text));
  CHECK(bytes_text(0) == "0 B");
  CHECK(bytes_text(1023) == "1023 B");
  CHECK(bytes_text(1024) == "1.0 KiB");
  CHECK(bytes_text(1'503'238'553) == "1.4 GiB");
  CHECK(bytes_text((1 << 20) - 1) == "1.0 MiB");
  CHECK(bytes_text(-2048) == "-2.0 KiB");
  CHECK(bytes_text(std::numeric_limits<std::int64_t>::max()) == "8.0 EiB");
  CHECK(bytes_text(std::numeric_limits<std::int64_t>::min()) == "-8.0 EiB");
}

TEST_CASE("days and seconds need their unit") {
  CHECK(parse_days("31 days") == 31);
  CHECK(parse_days("1 day") == 1);
  for (const char* text : {"31", "1.5 days", "-1 days", "3 weeks", "days", "1e12 days"}) CHECK_FALSE(parse_days(text));
  CHECK(parse_seconds("0 min") == 0.0);
  CHECK(parse_seconds("90 s") == 90.0);
  CHECK(parse_seconds("2 h") == 7200.0);
  CHECK(parse_seconds("0.5 days") == 43200.0);
  for (const char* text : {"90", "-1 s", "2 fortnights", "", "1e308 h"}) CHECK_FALSE(parse_seconds(text));
}

TEST_CASE("a quantity is a number and the rest") {
  CHECK(parse_quantity("-6.5 K/km") == std::pair{-6.5, std::string("K/km")});
  CHECK(parse_quantity("1mm/day") == std::pair{1.0, std::string("mm/day")});
  CHECK(parse_quantity(" 20 ") == std::pair{20.0, std::string()});
  CHECK_FALSE(parse_quantity("K/km"));
  CHECK_FALSE(parse_quantity("nan K"));
}

TEST_CASE("no text crashes the readers of words and numbers") {
  std::mt19937_64 random(6);
  for (int i = 0; i < 100'000; ++i) {
    std::string text;
    for (auto n = random() % 10; n > 0; --n) {
      text += random() % 2 == 0 ? static_cast<char>(random() % 256) : "0123456789.e+- KGiB"[random() % 19];
    }
    const auto quantity = parse_quantity(text);
    const auto number = parse_number(text);
    if (number) REQUIRE((quantity && quantity->first == *number && quantity->second.empty()));
    (void)parse_bytes(text);
    (void)parse_days(text);
    (void)parse_seconds(text);
    (void)nearest_word(text, {"mean-shift", text, ""});
  }
}
