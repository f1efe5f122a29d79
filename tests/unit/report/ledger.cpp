// Laws of the ledger's JSON form.
#include "windrow/report/ledger.h"

#include <doctest/doctest.h>

#include "windrow/base/error.h"

TEST_CASE("a ledger survives its JSON form, and no damaged text is taken for one") {
  windrow::report::Ledger ledger;
  ledger.version = "0";
  ledger.product = "tas.nc";
  ledger.key = {{"settings", "00ff"}};
  ledger.inputs = {{"in/a \"b\".nc", "0123", 42}};
  ledger.balance.months = {{"1981-01", 1, 2, 3, 4, 5e-16}};
  ledger.balance.stored = true;
  ledger.balance.stored_relative = 1e-9;
  ledger.counts = {{"missing", 7}};
  ledger.stations = {{"A1", "level"}};
  ledger.notices = {{"x", "y"}};
  const std::string text = windrow::report::to_json(ledger);
  CHECK(windrow::report::to_json(windrow::report::parse_ledger(text, "p")) == text);
  for (std::size_t length = 0; length + 2 < text.size(); length += 7) {
    CHECK_THROWS_AS(windrow::report::parse_ledger(text.substr(0, length), "p"), windrow::Error);
  }
}
