// What a station's fit rests on: matched months, monthly values, normals, reasons for leaving out.
#include <doctest/doctest.h>

#include <cmath>

#include "invented.h"

namespace windrow::adjust {

using namespace invented;

namespace {

/// Daily run 1980-1989 in which every day of month m of year y has the value 10 m + (y - 1980).
struct Run {
  Setup setup;
  calendar::Calendar calendar = cal("standard");
  std::vector<calendar::Date> dates = days(calendar, 1980, 1989);
  std::vector<double> model;
  Steps steps;

  explicit Run(calendar::Seasons seasons = calendar::Seasons::by_month(), Method method = Method::mean_shift) {
    setup.method = method;
    setup.seasons = seasons;
    setup.quantiles = 5;
    for (const auto& d : dates) model.push_back(10 * d.month + (d.year - 1980));
    steps = make_steps(setup, calendar, dates, std::make_pair(calendar::Date{1985, 1, 1}, calendar::Date{1989, 12, 31}),
                       true, "run");
  }
  [[nodiscard]] StationFit fit(const station::Record& record, std::vector<double> reduction = {},
                               std::pair<int, int> normals = {0, 0}, bool accept = false) const {
    return fit_station(setup, steps, model, record, reduction, normals, accept);
  }
};

station::Record monthly(int first, int last, double added) {
  station::Record r;
  for (int y = first; y <= last; ++y) {
    for (int m = 1; m <= 12; ++m) r.monthly.push_back({y, m, 10.0 * m + (y - 1980) + added});
  }
  return r;
}

station::Record normals(double offset) {
  station::Record r;
  for (int m = 1; m <= 12; ++m) r.normal.push_back(10.0 * m + offset);
  return r;
}

}  // namespace

TEST_CASE("the correction uses the station's own years, the target the calibration period") {
  const Run run;
  const StationFit fit = run.fit(monthly(1975, 1982, 3));  // in common: 1980-1982, none of it in the period
  REQUIRE(fit.level);
  CHECK_FALSE(fit.shape);
  CHECK_FALSE(fit.period_mismatch);
  CHECK(fit.months_matched == 36);
  for (std::size_t m = 0; m < 12; ++m) {
    CHECK(fit.correction_level[m] == doctest::Approx(3).epsilon(1e-12));
    // The days of 1985-1989, 10 m + 5..9; February 1988 has one day more.
    const double mean = m == 1 ? (28 * (5 + 6 + 7 + 9) + 29 * 8) / 141.0 : 7;
    CHECK(fit.target_level[m] == doctest::Approx(10.0 * (static_cast<double>(m) + 1) + mean + 3).epsilon(1e-12));
  }
}

TEST_CASE("daily stations match exactly their months, for level and shape") {
  const Run run(calendar::Seasons::by_month(), Method::quantile_mapping);
  station::Record r;
  std::vector<calendar::Date> observed;
  for (const auto& d : days(run.calendar, 1981, 1986)) {
    if (!(d.year == 1983 && d.month == 5)) observed.push_back(d);
  }
  std::vector<double> values;
  for (const auto& d : observed) values.push_back(10 * d.month + (d.year - 1980) + 2);
  r.daily = daily(observed, values);
  const StationFit fit = run.fit(r);
  REQUIRE(fit.shape);
  CHECK(fit.months_matched == 71);
  for (const double c : fit.correction_level) CHECK(c == doctest::Approx(2).epsilon(1e-12));
  for (const double c : fit.correction_shape) CHECK(std::abs(c) < 1e-12);
}

TEST_CASE("monthly values against windows and the year are weighed alike on both sides") {
  for (const auto& seasons : {calendar::Seasons::moving(31, 5), calendar::Seasons::by_year()}) {
    const Run run(seasons);
    auto record = monthly(1981, 1988, -1.5);
    record.monthly.erase(record.monthly.begin() + 4);  // one May less: still the same pairs on both sides
    const StationFit fit = run.fit(record);
    REQUIRE(fit.level);
    for (const double c : fit.correction_level) CHECK(c == doctest::Approx(-1.5).epsilon(1e-12));
  }
}

TEST_CASE("reduction brings observations down by the lapse of their month") {
  const Run run;
  std::vector<double> reduction;
  for (int m = 1; m <= 12; ++m) reduction.push_back(0.25 * m);
  const StationFit fit = run.fit(monthly(1981, 1988, 0), reduction);
  REQUIRE(fit.level);
  for (std::size_t m = 0; m < 12; ++m) {
    CHECK(fit.correction_level[m] == doctest::Approx(-0.25 * (static_cast<double>(m) + 1)).epsilon(1e-12));
  }
}

TEST_CASE("normals stand against the run's months inside their period") {
  const Run run;
  // The run has 1980-1984 of 1971-1984: model mean 10 m + 2.
  const StationFit fit = run.fit(normals(5), {}, {1971, 1984});
  REQUIRE(fit.level);
  CHECK_FALSE(fit.period_mismatch);
  CHECK(fit.months_matched == 60);
  for (const double c : fit.correction_level) CHECK(c == doctest::Approx(3).epsilon(1e-12));
  // Nothing in common: the calibration period 1985-1989, 10 m + 7, and it is said, accepted or not.
  for (const bool accept : {false, true}) {
    const StationFit far = run.fit(normals(5), {}, {1901, 1930}, accept);
    REQUIRE(far.level);
    CHECK(far.period_mismatch);
    for (const double c : far.correction_level) CHECK(c == doctest::Approx(-2).epsilon(1e-12));
  }
}

TEST_CASE("a series wins over normals; seasons it lacks come from normals") {
  const Run run;
  auto record = monthly(1981, 1988, 3);
  std::erase_if(record.monthly, [](const auto& v) { return v.month == 6; });
  CHECK(run.fit(record).left_out == "the station has no value that the run can be set against: June");
  record.normal = normals(5).normal;
  const StationFit fit = run.fit(record, {}, {1980, 1984});
  REQUIRE(fit.level);
  CHECK(fit.correction_level[4] == doctest::Approx(3).epsilon(1e-12));
  CHECK(fit.correction_level[5] == doctest::Approx(3).epsilon(1e-12));  // 5 - mean of 0..4
  record.normal = normals(6).normal;
  const StationFit other = run.fit(record, {}, {1980, 1984});
  CHECK(other.correction_level[4] == doctest::Approx(3).epsilon(1e-12));
  CHECK(other.correction_level[5] == doctest::Approx(4).epsilon(1e-12));
}

TEST_CASE("without a month in common a series is left out, or set against the whole period where accepted") {
  const Run run;
  const StationFit fit = run.fit(monthly(1950, 1960, 3));
  CHECK_FALSE(fit.level);
  CHECK(fit.left_out == "no month in common with the run; period_mismatch = \"accept\" uses it all the same");
  const StationFit accepted = run.fit(monthly(1950, 1960, 3), {}, {0, 0}, true);
  REQUIRE(accepted.level);
  CHECK(accepted.period_mismatch);
  // Observed 10 m + mean of -30..-20 + 3, calibration 10 m + 7: the change between the periods is part of it.
  for (const double c : accepted.correction_level) CHECK(c == doctest::Approx(-25 + 3 - 7).epsilon(1e-12));
  const Run mapping(calendar::Seasons::by_month(), Method::quantile_mapping);
  station::Record r;
  const auto old = days(run.calendar, 1950, 1960);
  r.daily = daily(old, std::vector<double>(old.size(), 1.0));
  CHECK(mapping.fit(r).left_out ==
        "no month in common with the run; period_mismatch = \"accept\" uses it all the same");
  const StationFit shape = mapping.fit(r, {}, {0, 0}, true);
  CHECK(shape.shape);
  CHECK(shape.period_mismatch);
}

TEST_CASE("a month the run has only in part does not count") {
  Run run;
  run.dates.erase(run.dates.begin(), run.dates.begin() + 14);  // begins on 15 January 1980
  run.model.erase(run.model.begin(), run.model.begin() + 14);
  run.steps = make_steps(run.setup, run.calendar, run.dates, {}, true, "run");
  CHECK(run.fit(monthly(1980, 1980, 0)).months_matched == 11);
  CHECK(run.fit(monthly(1980, 1981, 0)).months_matched == 23);
}

TEST_CASE("ratios: never over zero; an observed mean of zero is the smallest ratio") {
  Run run(calendar::Seasons::by_month(), Method::mean_ratio);
  auto record = monthly(1985, 1989, 0);
  for (auto& v : record.monthly) v.value *= v.month == 7 ? 0 : 2;
  const StationFit fit = run.fit(record);
  REQUIRE(fit.level);
  CHECK(std::exp(fit.correction_level[0]) == doctest::Approx(2).epsilon(1e-12));
  CHECK(std::exp(fit.correction_level[6]) == doctest::Approx(0.1).epsilon(1e-12));
  CHECK(std::exp(fit.target_level[6]) == doctest::Approx(7.7).epsilon(1e-12));
  for (std::size_t t = 0; t < run.model.size(); ++t) {
    if (run.dates[t].month == 3) run.model[t] = 0;
  }
  CHECK(run.fit(record).left_out == "a ratio needs a model mean above zero: March");
  record.monthly[0].value = -1e6;
  CHECK(run.fit(record).left_out == "a ratio needs an observed mean that is not negative: January");
}

TEST_CASE("a station where the model has no value is left out") {
  Run run;
  for (std::size_t t = 0; t < run.model.size(); ++t) {
    if (run.dates[t].month == 2) run.model[t] = NAN;
  }
  CHECK(run.fit(monthly(1981, 1988, 0)).left_out == "the model has no value: February");
}

TEST_CASE("monthly runs take monthly values, also of daily stations") {
  Setup setup;
  setup.daily = false;
  const auto dates = months(1980, 1989);
  const Steps steps = make_steps(setup, cal("360_day"), dates, {}, true, "run");
  CHECK_FALSE(setup.smoothed());
  std::vector<double> model;
  for (const auto& d : dates) model.push_back(10 * d.month + (d.year - 1980));
  auto record = monthly(1984, 1995, 4);
  record.daily = daily(dates, std::vector<double>(dates.size(), -50.0));  // must not be looked at
  const StationFit fit = fit_station(setup, steps, model, record, {}, {0, 0}, false);
  REQUIRE(fit.level);
  CHECK(fit.months_matched == 72);
  for (const double c : fit.correction_level) CHECK(c == doctest::Approx(4).epsilon(1e-12));
  const auto out = adjusted(setup, steps, model, Carried(setup, fit).target(), steps, model);
  CHECK(out[5] == doctest::Approx(64).epsilon(1e-12));
}

}  // namespace windrow::adjust
