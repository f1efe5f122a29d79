// Invented series for the tests of the adjustment: a seasonal course with noise, pinned seeds.
#pragma once
#include <cmath>
#include <random>
#include <vector>

#include "windrow/adjust/transfer.h"

namespace windrow::adjust::invented {

inline calendar::Calendar cal(const char* name) { return calendar::Calendar::from_cf(name, "test"); }

inline std::vector<calendar::Date> days(const calendar::Calendar& calendar, int first_year, int last_year) {
  std::vector<calendar::Date> dates;
  for (int y = first_year; y <= last_year; ++y) {
    for (int m = 1; m <= 12; ++m) {
      for (int d = 1; d <= calendar.days_in_month(y, m); ++d) dates.push_back({y, m, d});
    }
  }
  return dates;
}

inline std::vector<calendar::Date> months(int first_year, int last_year) {
  std::vector<calendar::Date> dates;
  for (int y = first_year; y <= last_year; ++y) {
    for (int m = 1; m <= 12; ++m) dates.push_back({y, m, 15});
  }
  return dates;
}

/// Uniform in [0, 1), the same on every platform.
class Random {
 public:
  explicit Random(unsigned seed) : engine_(seed) {}
  double operator()() { return static_cast<double>(engine_() >> 11) * 0x1p-53; }

 private:
  std::mt19937_64 engine_;
};

/// offset + amplitude * course of the year + spread * noise (sum of four uniforms, centred).
inline std::vector<double> series(const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                                  double offset, double amplitude, double spread, unsigned seed) {
  Random random(seed);
  std::vector<double> values;
  for (const auto& date : dates) {
    const double noise = random() + random() + random() + random() - 2;
    values.push_back(offset - amplitude * std::cos(6.283185307179586 * calendar.year_fraction(date)) + spread * noise);
  }
  return values;
}

/// Rain-like: zero on three days of five, else a skewed amount with a course of the year.
inline std::vector<double> rain(const calendar::Calendar& calendar, const std::vector<calendar::Date>& dates,
                                double scale, unsigned seed) {
  Random random(seed);
  std::vector<double> values;
  for (const auto& date : dates) {
    const double wet = random(), amount = random();
    const double course = 1.2 - std::cos(6.283185307179586 * calendar.year_fraction(date));
    values.push_back(wet < 0.6 ? 0 : scale * course * amount * amount * 10);
  }
  return values;
}

inline station::DailySeries daily(const std::vector<calendar::Date>& dates, const std::vector<double>& values) {
  const auto gregorian = cal("proleptic_gregorian");
  station::DailySeries out;
  for (std::size_t i = 0; i < dates.size(); ++i) {
    out.day.push_back(gregorian.day_number(dates[i]));
    out.value.push_back(values[i]);
  }
  return out;
}

/// A cell that carries one station's fit alone. The target it gives points into it.
struct Carried {
  std::vector<double> level, shape, mean_level, mean_shape;
  explicit Carried(const Setup& setup, const StationFit& fit)
      : level(setup.carry_target ? fit.target_level : fit.correction_level),
        shape(setup.carry_target ? fit.target_shape : fit.correction_shape),
        mean_level(fit.correction_level),
        mean_shape(fit.correction_shape) {}
  [[nodiscard]] CellTarget target(double fade = 1) const { return {level, shape, mean_level, mean_shape, fade, fade}; }
};

inline std::vector<double> adjusted(const Setup& setup, const Steps& anchor_steps, const std::vector<double>& anchor,
                                    const CellTarget& target, const Steps& steps, const std::vector<double>& values,
                                    Correction* correction_out = nullptr) {
  const RowClimate climate = fit_row(setup, anchor_steps, anchor);
  const Draws anchor_draws(1, anchor_steps.date), run_draws(1, steps.date);
  const GeoPoint place{Angle::degrees(8.5), Angle::degrees(47.3)};
  const CellDraws at_anchor(anchor_draws, place), at_run(run_draws, place);
  Correction correction;
  make_correction(setup, anchor_steps, climate, anchor, target, &at_anchor, correction);
  Ranks ranks;
  rank_series(setup, steps, climate, values, ranks);
  std::vector<double> out(values.size());
  evaluate(setup, steps, values, ranks, correction, &at_run, out);
  if (correction_out) *correction_out = correction;
  return out;
}

}  // namespace windrow::adjust::invented
