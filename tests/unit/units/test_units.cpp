// Laws of units: repairs, exact conversions, water, refusals.
#include <doctest/doctest.h>

#include <cmath>
#include <random>
#include <thread>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/units/units.h"

using namespace windrow;
using namespace windrow::units;

namespace {

std::string refusal(const std::string& from, const std::string& to, const std::string& name = "") {
  try {
    conversion(from, to, name, "a.nc: pr");
  } catch (const Error& error) {
    CHECK(error.kind() == Failure::data);
    return error.what();
  }
  return "converted";
}

}  // namespace

TEST_CASE("misspelt units are repaired and told, right ones left alone") {
  struct Case {
    const char *units, *right;
  };
  for (const auto& [units, right] : std::vector<Case>{{"m s**-1", "m s-1"},
                                                      {"millibars", "millibar"},
                                                      {"mb", "millibar"},
                                                      {"deg_C", "degC"},
                                                      {"degrees C", "degC"},
                                                      {"celsius", "degC"},
                                                      {"\u00b0C", "degC"},
                                                      {"\xb0"
                                                       "C",
                                                       "degC"},
                                                      {"degrees K", "K"},
                                                      {"mm d-1", "mm day-1"},
                                                      {"mm/d", "mm/day"},
                                                      {"kg m-2 d^-1", "kg m-2 day^-1"},
                                                      {"mm/24h", "mm day-1"},
                                                      {"m\u00b3 s\u207b\u00b9", "m3 s-1"},
                                                      {"hpa", "hPa"},
                                                      {"(0 - 1)", "1"}}) {
    std::string odd;
    CHECK(repaired(units, &odd) == right);
    CHECK(odd.find("are read as '" + std::string(right) + "'") != std::string::npos);
    CHECK(known(units));
    CHECK(repaired(right, nullptr) == right);
  }
  for (const char* units : {"K", "degC", "m s-1", "kg m-2 s-1", "W m-2", "%", "1", "", "meters", "\u00b5g/m3",
                            "mm day-1", "m^2", "mol/mol", "Pa"}) {
    std::string odd;
    CHECK(repaired(units, &odd) == units);
    CHECK(odd.empty());
    CHECK(known(units));
  }
  std::string odd;
  CHECK(repaired("deg_C", &odd) == "degC");
  CHECK(odd == "units 'deg_C' are read as 'degC'");
  CHECK(repaired("  m   s-1 ", nullptr) == "m s-1");
}

TEST_CASE("plain conversions are exact where the ratio is whole") {
  const auto affine = [](const char* from, const char* to) { return conversion(from, to, "x", "").affine; };
  CHECK(affine("hPa", "Pa").scale == 100);
  CHECK(affine("Pa", "hPa").scale == 1.0 / 100);
  CHECK(affine("K", "degC").scale == 1);
  CHECK(affine("K", "degC").offset == -273.15);
  CHECK(affine("degC", "K").offset == 273.15);
  CHECK(affine("m s-1", "mm/day").scale == 86'400'000);
  CHECK(affine("mm/day", "m s-1").scale == 1.0 / 86'400'000);
  CHECK(affine("%", "1").scale == 0.01);
  CHECK(affine("km", "m")(1.5) == 1500);
  CHECK(affine("degC", "celsius").identity());
  CHECK(affine("K/km", "K m-1").scale == 0.001);
  CHECK(affine("\u00b5g/m3", "kg m-3").scale == doctest::Approx(1e-9).epsilon(1e-15));
  // Definition of degree Fahrenheit: 32 is the ice point, 212 is 100 degC.
  CHECK(affine("degF", "degC")(212) == doctest::Approx(100).epsilon(1e-14));
  CHECK(std::fabs(affine("degF", "degC")(32)) < 1e-12);
}

TEST_CASE("there and back gives the value again") {
  for (const auto& [from, to] : std::vector<std::pair<const char*, const char*>>{{"K", "degC"},
                                                                                 {"degF", "K"},
                                                                                 {"inch", "mm"},
                                                                                 {"knot", "m s-1"},
                                                                                 {"g/kg", "1"},
                                                                                 {"W m-2", "cal cm-2 min-1"}}) {
    const Affine there = conversion(from, to, "", "").affine, back = conversion(to, from, "", "").affine;
    for (const double x : {-40.0, 0.0, 0.125, 300.0, 101325.0}) {
      // Two roundings on values as large as the offsets.
      CHECK(std::fabs(back(there(x)) - x) <= 4 * 2.3e-16 * (std::fabs(x) + 500));
    }
  }
}

TEST_CASE("a mass of water becomes a depth with 1000 kg m-3 and changes its standard name") {
  const Conversion flux = conversion("kg m-2 s-1", "mm/day", "precipitation_flux", "");
  CHECK(flux.affine.scale == 86400);
  CHECK(flux.affine.offset == 0);
  CHECK(flux.standard_name == "lwe_precipitation_rate");
  CHECK(flux.note == "1000 kg m-3");
  const Conversion amount = conversion("kg m-2", "mm", "precipitation_amount", "");
  CHECK(amount.affine.scale == 1);
  CHECK(amount.standard_name == "lwe_thickness_of_precipitation_amount");
  CHECK(conversion("kg m**-2 s**-1", "m s-1", "snowfall_flux", "").standard_name == "lwe_snowfall_rate");
  CHECK(conversion("kg m-2 d-1", "mm/day", "precipitation_flux", "").affine.scale == 1);
  const Conversion back = conversion("mm/day", "kg m-2 s-1", "lwe_precipitation_rate", "");
  CHECK(back.affine.scale == 1.0 / 86400);
  CHECK(back.standard_name == "precipitation_flux");
  CHECK(conversion("kg m-2 s-1", "mm/day", "", "").standard_name.empty());
  CHECK(conversion("kg m-2 s-1", "mm/day", "runoff_flux", "").standard_name.empty());
  const Conversion same = conversion("kg m-2 s-1", "kg m-2 day-1", "precipitation_flux", "");
  CHECK(same.standard_name == "precipitation_flux");
  CHECK(same.note.empty());
}

TEST_CASE("C and F opposite a temperature are degrees") {
  const Conversion celsius = conversion("C", "K", "air_temperature", "");
  CHECK(celsius.affine.offset == 273.15);
  CHECK(celsius.note == "units 'C' are read as 'degC'");
  CHECK(conversion("K", "F", "air_temperature", "").affine(273.15) == doctest::Approx(32).epsilon(1e-12));
  CHECK(conversion("C", "A s", "", "").affine.identity());
}

TEST_CASE("what cannot be converted is refused in one line") {
  CHECK(refusal("flurbs", "K") == "a.nc: pr: units 'flurbs' are not known to UDUNITS");
  CHECK(refusal("K", "flurbs") == "a.nc: pr: units 'flurbs' are not known to UDUNITS");
  CHECK(refusal("kg m-2 s-1", "K", "precipitation_flux") == "a.nc: pr: units 'kg m-2 s-1' cannot be converted to 'K'");
  CHECK(refusal("kg m-2 s-1", "mm", "precipitation_flux") ==
        "a.nc: pr: units 'kg m-2 s-1' cannot be converted to 'mm'");
  CHECK(
      refusal("kg m-2 s-1", "mm/day", "tendency_of_atmosphere_mass_content_of_sulfur") ==
      "a.nc: pr: units 'kg m-2 s-1' cannot be converted to 'mm/day': tendency_of_atmosphere_mass_content_of_sulfur is "
      "not known to be water");
  CHECK(refusal("dBZ", "mm6 m-3") == "a.nc: pr: units 'dBZ' cannot be converted to 'mm6 m-3'");
  CHECK_FALSE(known("flurbs"));
  CHECK_FALSE(known(std::string(1000, 'm')));
  CHECK_FALSE(known(std::string("m\0m", 3)));
}

TEST_CASE("only scales with an arbitrary zero are temperatures in the sense of units_metadata") {
  for (const char* units : {"degC", "celsius", "degF", "deg_F"}) CHECK(is_temperature(units));
  for (const char* units : {"K", "kelvin", "mm", "C", "flurbs", "K m-1"}) CHECK_FALSE(is_temperature(units));
}

TEST_CASE("per month is told from the spelling") {
  std::string amount;
  for (const char* units : {"mm/month", "mm month-1", "mm mon-1", "mm per month", "mm month**-1", "mm months-1"}) {
    amount.clear();
    CHECK(per_month(units, &amount));
    CHECK(amount == "mm");
  }
  CHECK(per_month("kg m-2 month-1", &amount));
  CHECK(amount == "kg m-2");
  for (const char* units : {"mm", "mm/day", "month", "/month", ""}) CHECK_FALSE(per_month(units, &amount));
}

TEST_CASE("threads may convert at the same time") {
  std::vector<std::thread> threads;
  std::vector<double> scales(4);
  for (std::size_t t = 0; t < scales.size(); ++t) {
    threads.emplace_back([&, t] {
      for (int i = 0; i < 200; ++i)
        scales[t] = conversion("kg m-2 s-1", "mm/day", "precipitation_flux", "").affine.scale;
    });
  }
  for (std::thread& thread : threads) thread.join();
  CHECK(scales == std::vector<double>(4, 86400));
}

TEST_CASE("no text crashes the reading of units: they are known or not") {
  std::mt19937_64 random(2012);
  const std::string pieces[] = {"m",          "kg",     " ", "-1", "/",   "**",    "^",    "(",          ")",
                                ".",          "day",    "2", "K",  "@",   "since", "\xb5", "\xc2\xb5",   "e9",
                                "9999999999", "lg(re ", "1", "%",  "log", "-",     "degC", "1850-01-01", "\n"};
  int read = 0;
  for (int i = 0; i < 30'000; ++i) {
    std::string text;
    for (auto n = random() % 9; n > 0; --n) text += pieces[random() % std::size(pieces)];
    read += known(text);
    try {
      (void)conversion(text, "mm/day", "", "fuzz");
    } catch (const Error& error) {
      REQUIRE(error.kind() == Failure::data);
    }
    std::string amount;
    (void)per_month(text, &amount);
    (void)is_temperature(text);
  }
  CHECK(read > 1000);  // or the test would try refusals only
}
