// Fits, carries and evaluates one transfer read from standard input, and prints every number: for
// tests/reference/transfers.py, which writes the input and knows its order. Test use only.
#include <algorithm>
#include <cstdio>
#include <exception>
#include <iostream>
#include <stdexcept>
#include <string>
#include <vector>

#include "windrow/adjust/transfer.h"

namespace {

using namespace windrow;
using namespace windrow::adjust;

/// The next word must be `name`: keeps both sides honest about the order.
void expect(const std::string& name) {
  std::string word;
  if (!(std::cin >> word) || word != name) throw std::runtime_error("expected '" + name + "', found '" + word + "'");
}

/// Through text, because streams do not read "nan".
double number() {
  std::string word;
  std::cin >> word;
  return std::stod(word);
}

template <class T>
T value(const std::string& name) {
  expect(name);
  T v{};
  std::cin >> v;
  return v;
}

std::vector<double> numbers(const std::string& name) {
  std::vector<double> v(value<std::size_t>(name));
  for (double& x : v) x = number();
  return v;
}

calendar::Date date() {
  calendar::Date d;
  std::cin >> d.year >> d.month >> d.day;
  return d;
}

void print(const char* name, const std::vector<double>& values) {
  std::printf("%s", name);
  for (const double v : values) std::printf(" %.17g", v);
  std::printf("\n");
}

Setup read_setup() {
  Setup setup;
  const auto method = value<std::string>("method");
  const std::vector<std::pair<std::string, Method>> methods = {
      {"mean-shift", Method::mean_shift},
      {"mean-ratio", Method::mean_ratio},
      {"variance-scaling", Method::variance_scaling},
      {"quantile-mapping", Method::quantile_mapping},
      {"detrended-quantile-mapping", Method::detrended_quantile_mapping},
      {"quantile-delta-mapping", Method::quantile_delta_mapping},
      {"gamma-mapping", Method::gamma_mapping}};
  const auto named = std::find_if(methods.begin(), methods.end(), [&](const auto& m) { return m.first == method; });
  if (named == methods.end()) throw std::runtime_error("unknown method '" + method + "'");
  setup.method = named->second;
  setup.ratio_form = value<std::string>("form") == "multiplicative";
  setup.wet_day = value<double>("wet_day");
  setup.window_years = value<int>("window");
  setup.window_step = value<int>("window_step");
  const auto season = value<std::string>("season");
  setup.seasons = season == "month"  ? calendar::Seasons::by_month()
                  : season == "year" ? calendar::Seasons::by_year()
                                     : calendar::Seasons::moving(std::stoi(season), 5);
  setup.quantiles = value<int>("quantiles");
  setup.max_ratio = value<double>("max_ratio");
  setup.carry_target = value<int>("carry_target") != 0;
  setup.daily = value<int>("daily_model") != 0;
  return setup;
}

station::Record read_record() {
  const auto gregorian = calendar::Calendar::from_cf("proleptic_gregorian", "input");
  station::Record record;
  const auto days = value<std::size_t>("daily");
  for (std::size_t i = 0; i < days; ++i) {
    record.daily.day.push_back(gregorian.day_number(date()));
    record.daily.value.push_back(number());
  }
  record.monthly.resize(value<std::size_t>("monthly"));
  for (auto& m : record.monthly) {
    std::cin >> m.year >> m.month;
    m.value = number();
  }
  record.normal = numbers("normal");
  return record;
}

void run() {
  const Setup setup = read_setup();
  const auto calendar = calendar::Calendar::from_cf(value<std::string>("calendar"), "input");
  std::vector<calendar::Date> dates(value<std::size_t>("dates"));
  for (auto& d : dates) d = date();
  expect("period");
  const calendar::Date first = date();
  const Steps steps = make_steps(setup, calendar, dates, std::make_pair(first, date()), true, "input");
  expect("normals_period");
  std::pair<int, int> normals_period;
  std::cin >> normals_period.first >> normals_period.second;
  const auto accept = value<int>("accept_mismatch") != 0;
  const auto fade_level = value<double>("fade_level"), fade_shape = value<double>("fade_shape");
  const auto mean_offset = value<double>("mean_offset");
  const auto reduction = numbers("reduction");
  const auto station = numbers("station"), cell = numbers("cell"), series = numbers("series");
  const station::Record record = read_record();

  const StationFit fit = fit_station(setup, steps, station, record, reduction, normals_period, accept);
  std::printf("facts %d %d %d %d\n", fit.level, fit.shape, fit.months_matched, fit.period_mismatch);
  print("target_level", fit.target_level);
  print("correction_level", fit.correction_level);
  print("target_shape", fit.target_shape);
  print("correction_shape", fit.correction_shape);
  if (!fit.level) return;

  // One station is all there is: its values are carried, and the mean over stations is set off from them.
  std::vector<double> mean_level = fit.correction_level, mean_shape = fit.correction_shape;
  for (double& v : mean_level) v += mean_offset;
  for (double& v : mean_shape) v *= 1 + mean_offset;
  const CellTarget target{setup.carry_target ? fit.target_level : fit.correction_level,
                          setup.carry_target ? fit.target_shape : fit.correction_shape,
                          mean_level,
                          mean_shape,
                          fade_level,
                          fade_shape};
  const RowClimate climate = fit_row(setup, steps, cell);
  Correction correction;
  const Draws draws(1, steps.date);
  const CellDraws at_cell(draws, {Angle::degrees(8.5), Angle::degrees(47.3)});
  make_correction(setup, steps, climate, cell, target, &at_cell, correction);
  Ranks ranks;
  rank_series(setup, steps, climate, series, ranks);
  std::vector<double> out(series.size());
  evaluate(setup, steps, series, ranks, correction, &at_cell, out);
  std::printf("counts %d %d\n", correction.reordered, correction.capped);
  print("out", out);
}

}  // namespace

int main() {
  try {
    run();
  } catch (const std::exception& e) {
    std::fprintf(stderr, "%s\n", e.what());
    return 1;
  }
  return 0;
}
