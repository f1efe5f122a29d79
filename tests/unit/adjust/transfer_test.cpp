// Laws of the transfers, and one quantile-mapped value to check by hand.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "invented.h"
#include "windrow/base/error.h"

namespace windrow::adjust {

using namespace invented;

namespace {

struct Case {
  const char* calendar;
  calendar::Seasons seasons;
};

std::vector<Case> cases() {
  return {{"noleap", calendar::Seasons::by_month()},
          {"standard", calendar::Seasons::by_month()},
          {"standard", calendar::Seasons::by_year()},
          {"360_day", calendar::Seasons::moving(31, 5)},
          {"standard", calendar::Seasons::moving(31, 5)}};
}

/// A run of eight years, a station with five of them and a cell; everything calibrated on six years.
struct World {
  Setup setup;
  calendar::Calendar calendar;
  std::vector<calendar::Date> dates;
  Steps steps;
  std::vector<double> at_station, at_cell;
  station::Record record;
  StationFit fit;

  World(Method method, const Case& c, unsigned seed, bool carry_target = true) : calendar(cal(c.calendar)) {
    setup.method = method;
    setup.seasons = c.seasons;
    setup.quantiles = 20;
    setup.carry_target = carry_target;
    dates = days(calendar, 1990, 1997);
    steps = make_steps(
        setup, calendar, dates,
        std::make_pair(calendar::Date{1991, 1, 1}, calendar::Date{1996, 12, calendar.days_in_month(1996, 12)}), true,
        "invented");
    const auto gregorian = cal("proleptic_gregorian");
    const auto observed_days = days(gregorian, 1992, 1996);
    if (setup.multiplicative()) {
      at_station = rain(calendar, dates, 1, seed);
      at_cell = rain(calendar, dates, 1.3, seed + 1);
      record.daily = daily(observed_days, rain(gregorian, observed_days, 1.7, seed + 2));
    } else {
      at_station = series(calendar, dates, 8, 10, 4, seed);
      at_cell = series(calendar, dates, 6, 9, 5, seed + 1);
      record.daily = daily(observed_days, series(gregorian, observed_days, 9, 8, 6, seed + 2));
    }
    fit = fit_station(setup, steps, at_station, record, {}, {0, 0}, false);
  }
};

double relative(double a, double b) { return std::abs(a - b) / std::max(1.0, std::abs(b)); }

}  // namespace

TEST_CASE("a quantile-mapped value checked by hand") {
  // Two nodes (tau = 1/4, 3/4). Model at the station 1..5: nodes 2 and 4, mean 3. Observed 10 10 16 20 24: nodes 10 and
  // 20, mean 16. Corrections 8 and 16 give the target nodes 10 and 20, level 16, shape -6 and +4.
  // Cell 2 4 6 8 10: nodes 4 and 8, so 6 and 12 are added there; half weight each makes the mean 6 + 9 = 15, and the
  // reset to the level 16 adds 1: corrections 7 and 13. Then 5 (a quarter of the way) becomes 5 + 7 + 6/4 = 13.5.
  Setup setup;
  setup.method = Method::quantile_mapping;
  setup.seasons = calendar::Seasons::by_year();
  setup.quantiles = 2;
  const std::vector<calendar::Date> dates = {{1990, 1, 1}, {1990, 1, 2}, {1990, 1, 3}, {1990, 1, 4}, {1990, 1, 5}};
  const Steps steps = make_steps(setup, cal("noleap"), dates, {}, true, "hand");
  station::Record record;
  record.daily = daily(dates, {10, 20, 16, 10, 24});
  const StationFit fit = fit_station(setup, steps, std::vector<double>{3, 1, 2, 5, 4}, record, {}, {0, 0}, false);
  REQUIRE(fit.shape);
  CHECK(fit.target_level == std::vector<double>{16});
  CHECK(fit.correction_level == std::vector<double>{13});
  CHECK(fit.target_shape == std::vector<double>{-6, 4});
  CHECK(fit.correction_shape == std::vector<double>{-5, 3});
  const std::vector<double> cell = {4, 2, 6, 10, 8};
  Correction correction;
  const auto calibrated = adjusted(setup, steps, cell, Carried(setup, fit).target(), steps, cell, &correction);
  CHECK(correction.table == std::vector<double>{7, 13});
  CHECK(calibrated == std::vector<double>{11, 9, 16, 23, 21});
  const auto out = adjusted(setup, steps, cell, Carried(setup, fit).target(), steps, {5, 0, 100, NAN, 7});
  CHECK(out[0] == 13.5);
  CHECK(out[1] == 7);
  CHECK(out[2] == 113);
  CHECK(std::isnan(out[3]));
  CHECK(out[4] == 18.5);
}

TEST_CASE("where observations equal the model, the transfer is the identity") {
  for (const Method method : {Method::mean_shift, Method::mean_ratio, Method::quantile_mapping}) {
    for (const Case& c : cases()) {
      // Observations are days of the Gregorian calendar: equal to the model where the model has that calendar.
      if (std::string(c.calendar) != "standard") continue;
      World w(method, c, 100);
      station::Record same;
      same.daily = daily(w.dates, w.at_station);
      const StationFit fit = fit_station(w.setup, w.steps, w.at_station, same, {}, {0, 0}, false);
      REQUIRE(fit.level);
      CHECK(fit.months_matched == 96);
      const auto out = adjusted(w.setup, w.steps, w.at_station, Carried(w.setup, fit).target(), w.steps, w.at_station);
      double worst = 0;
      for (std::size_t t = 0; t < out.size(); ++t) worst = std::max(worst, relative(out[t], w.at_station[t]));
      CHECK(worst < 1e-12);
    }
  }
}

TEST_CASE("calibration means become the level") {
  for (const Method method : {Method::mean_shift, Method::mean_ratio, Method::quantile_mapping}) {
    for (const bool carry_target : {true, false}) {
      for (const double fade : {1.0, 0.3, 0.0}) {
        for (const Case& c : cases()) {
          World w(method, c, 200, carry_target);
          w.setup.max_ratio = 1e6;
          REQUIRE(w.fit.level);
          const Carried carried(w.setup, w.fit);
          const CellTarget target = carried.target(fade);
          const RowClimate climate = fit_row(w.setup, w.steps, w.at_cell);
          const auto out = adjusted(w.setup, w.steps, w.at_cell, target, w.steps, w.at_cell);
          double worst = 0;
          for (int s = 0; s < w.setup.seasons.count(); ++s) {
            const auto i = static_cast<std::size_t>(s);
            const bool multiplicative = w.setup.multiplicative();
            const double own = climate.mean[i];
            const double near = multiplicative ? std::exp(target.level[i]) * (carry_target ? 1 : own)
                                               : target.level[i] + (carry_target ? 0 : own);
            const double far = multiplicative ? own * std::exp(target.mean_correction_level[i])
                                              : own + target.mean_correction_level[i];
            // A season's own transfer over the season's sample (windows overlap, so not the evaluated series).
            double sum = 0;
            const auto from = w.steps.sample.start[i], to = w.steps.sample.start[i + 1];
            Steps one = w.steps;
            if (w.setup.seasons.is_moving()) {
              for (auto p = from; p < to; ++p) one.season[w.steps.sample.step[p]] = static_cast<std::int16_t>(s);
            }
            const auto own_out =
                w.setup.seasons.is_moving() ? adjusted(w.setup, w.steps, w.at_cell, target, one, w.at_cell) : out;
            for (auto p = from; p < to; ++p) sum += own_out[w.steps.sample.step[p]];
            worst = std::max(worst, relative(sum / (to - from), fade * near + (1 - fade) * far));
            if (w.setup.seasons.is_moving() && s > 6) break;  // the first windows are enough
          }
          INFO(c.calendar << " method " << static_cast<int>(method) << " fade " << fade);
          CHECK(worst < 1e-9);
        }
      }
    }
  }
}

TEST_CASE("mean-shift returns an added constant, mean-ratio a factor") {
  for (const Case& c : cases()) {
    World shift(Method::mean_shift, c, 300);
    World ratio(Method::mean_ratio, c, 310);
    for (World* w : {&shift, &ratio}) {
      const Carried carried(w->setup, w->fit);
      const CellTarget target = carried.target(0.8);
      auto changed = w->at_cell;
      for (double& v : changed) v = w->setup.multiplicative() ? v * 1.3 : v + 1.75;
      const auto before = adjusted(w->setup, w->steps, w->at_cell, target, w->steps, w->at_cell);
      const auto after = adjusted(w->setup, w->steps, w->at_cell, target, w->steps, changed);
      double worst = 0;
      for (std::size_t t = 0; t < after.size(); ++t) {
        worst = std::max(worst, relative(after[t], w->setup.multiplicative() ? before[t] * 1.3 : before[t] + 1.75));
      }
      CHECK(worst < 1e-14);
    }
  }
}

TEST_CASE("quantile-mapping keeps the order within a season, also beyond the calibrated range") {
  for (const Case& c : cases()) {
    for (const unsigned seed : {400u, 410u, 420u}) {
      World w(Method::quantile_mapping, c, seed);
      REQUIRE(w.fit.shape);
      auto values = w.at_cell;
      for (std::size_t t = 0; t < values.size(); ++t) values[t] = 2 * values[t] - 5;  // wider than calibrated
      const auto out = adjusted(w.setup, w.steps, w.at_cell, Carried(w.setup, w.fit).target(0.6), w.steps, values);
      std::vector<std::size_t> order(values.size());
      std::iota(order.begin(), order.end(), 0u);
      std::sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
        return w.steps.season[a] != w.steps.season[b] ? w.steps.season[a] < w.steps.season[b] : values[a] < values[b];
      });
      double inversion = 0;
      for (std::size_t i = 1; i < order.size(); ++i) {
        if (w.steps.season[order[i]] == w.steps.season[order[i - 1]]) {
          inversion = std::max(inversion, out[order[i - 1]] - out[order[i]]);
        }
      }
      // The stored weight is single precision: neighbours closer than that may swap by that much of a node's distance.
      CHECK(inversion < 1e-6);
    }
  }
}

TEST_CASE("targets out of order are pooled, counted, and still meet the level") {
  World w(Method::quantile_mapping, cases()[0], 500);
  Carried carried(w.setup, w.fit);
  Correction correction;
  const RowClimate climate = fit_row(w.setup, w.steps, w.at_cell);
  make_correction(w.setup, w.steps, climate, w.at_cell, carried.target(), nullptr, correction);
  const int as_fitted = correction.reordered;
  std::swap(carried.shape[3], carried.shape[9]);  // nodes 3 to 9 of January
  make_correction(w.setup, w.steps, climate, w.at_cell, carried.target(), nullptr, correction);
  CHECK(correction.reordered == as_fitted + 7);
  double before = -1e30, mean = climate.mean[0];
  for (std::size_t k = 0; k < 20; ++k) {
    const double target = climate.node[k] + correction.table[k];
    CHECK(target >= before - 1e-12);
    before = target;
    mean += climate.node_weight[k] * correction.table[k];
  }
  CHECK(mean == doctest::Approx(carried.level[0]).epsilon(1e-12));
}

TEST_CASE("a cell with the station's own climate gets the station's target whatever is carried") {
  World w(Method::quantile_mapping, cases()[4], 600);
  World v(Method::quantile_mapping, cases()[4], 600, false);
  const auto a = adjusted(w.setup, w.steps, w.at_station, Carried(w.setup, w.fit).target(), w.steps, w.at_station);
  const auto b = adjusted(v.setup, v.steps, v.at_station, Carried(v.setup, v.fit).target(), v.steps, v.at_station);
  const auto faded = adjusted(w.setup, w.steps, w.at_station, Carried(w.setup, w.fit).target(0), w.steps, w.at_station);
  for (std::size_t t = 0; t < a.size(); t += 97) {
    CHECK(relative(a[t], b[t]) < 1e-12);
    CHECK(relative(a[t], faded[t]) < 1e-12);
  }
}

TEST_CASE("missing values stay missing and places without climate stay missing") {
  for (const Method method : {Method::mean_shift, Method::mean_ratio, Method::quantile_mapping}) {
    for (const Case& c : cases()) {
      World w(method, c, 700);
      auto holes = w.at_cell;
      for (std::size_t t = 0; t < holes.size(); t += 3) holes[t] = NAN;
      const Carried carried(w.setup, w.fit);
      const CellTarget target = carried.target();
      const auto out = adjusted(w.setup, w.steps, holes, target, w.steps, holes);
      bool same = true;
      for (std::size_t t = 0; t < out.size(); ++t) same = same && std::isnan(out[t]) == std::isnan(holes[t]);
      CHECK(same);
      const std::vector<double> nothing(w.dates.size(), NAN);
      const auto none = adjusted(w.setup, w.steps, nothing, target, w.steps, w.at_cell);
      CHECK(std::all_of(none.begin(), none.end(), [](double v) { return std::isnan(v); }));
    }
  }
}

TEST_CASE("a month without climate leaves the other months unsmoothed, not missing") {
  World w(Method::mean_shift, cases()[0], 710);
  auto holes = w.at_cell;
  for (std::size_t t = 0; t < holes.size(); ++t) {
    if (w.dates[t].month == 7) holes[t] = NAN;
  }
  const auto out = adjusted(w.setup, w.steps, holes, Carried(w.setup, w.fit).target(), w.steps, holes);
  CHECK(out[0] - holes[0] == doctest::Approx(out[30] - holes[30]).epsilon(1e-12));
  CHECK(std::isnan(out[200]));
}

TEST_CASE("ratios are capped and counted, never made over zero, never negative") {
  World w(Method::mean_ratio, cases()[0], 720);
  Carried carried(w.setup, w.fit);
  for (double& v : carried.level) v += std::log(1000.0);
  auto dry = w.at_cell;
  for (std::size_t t = 0; t < dry.size(); ++t) {
    if (w.dates[t].month == 8) dry[t] = 0;
  }
  Correction correction;
  const auto out = adjusted(w.setup, w.steps, dry, carried.target(), w.steps, dry, &correction);
  CHECK(correction.capped == 12);
  CHECK(std::all_of(out.begin(), out.end(), [](double v) { return v >= 0; }));
  double in = 0, made = 0;
  for (std::size_t t = 0; t < dry.size(); ++t) {
    if (!w.steps.in_period[t] || w.dates[t].month != 2) continue;
    in += dry[t];
    made += out[t];
  }
  CHECK(made / in == doctest::Approx(10).epsilon(1e-12));
}

TEST_CASE("tails beyond the outermost nodes are marked and get the outermost correction") {
  World w(Method::quantile_mapping, cases()[2], 730);
  const RowClimate climate = fit_row(w.setup, w.steps, w.at_cell);
  Ranks ranks;
  const std::vector<double> values = {-100, climate.node.front(), climate.node.back(), 100, NAN};
  rank_series(w.setup, w.steps, climate, values, ranks);
  CHECK(ranks.tail == std::vector<std::uint8_t>{1, 0, 0, 2, 0});
  CHECK(ranks.node[0] == 0);
  CHECK(ranks.weight[0] == 0);
  CHECK(ranks.node[3] == 18);
  CHECK(ranks.weight[3] == 1);
  CHECK(ranks.node[2] + static_cast<double>(ranks.weight[2]) == 19);
}

TEST_CASE("a smoothed correction refuses the days of another calendar") {
  Setup setup;
  const auto custom = calendar::Calendar::custom({30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 30, 35}, 0, 2);
  const auto dates = days(custom, 1990, 1991);
  const Steps steps = make_steps(setup, custom, dates, {}, true, "custom");
  Correction correction;
  correction.table.resize(1091);
  std::vector<double> values(dates.size(), 1.0), out(dates.size());
  CHECK_THROWS_WITH_AS(evaluate(setup, steps, values, {}, correction, nullptr, out),
                       "adjustment: the correction was made for the days of another calendar", Error);
}

}  // namespace windrow::adjust
