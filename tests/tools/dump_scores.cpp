// Scores series read from standard input, and prints every number: for tests/reference/scores.py, which writes the
// input and knows its order. Test use only.
#include <cmath>
#include <cstdio>
#include <exception>
#include <iostream>
#include <stdexcept>
#include <string>
#include <vector>

#include "windrow/scores/areas.h"
#include "windrow/scores/change.h"
#include "windrow/scores/verdict.h"
#include "windrow/stats/gamma.h"

namespace {

using namespace windrow;
using namespace windrow::scores;

/// Through text, because streams do not read "nan".
double number() {
  std::string word;
  if (!(std::cin >> word)) throw std::runtime_error("the input ends early");
  return std::stod(word);
}

int whole_number() { return static_cast<int>(number()); }

std::vector<double> numbers(std::size_t n) {
  std::vector<double> out(n);
  for (double& v : out) v = number();
  return out;
}

void print(const std::string& name, const std::vector<double>& values) {
  std::printf("%s", name.c_str());
  for (const double v : values) std::printf(" %.17g", v);
  std::printf("\n");
}

struct Input {
  Options options;
  Days days;
  Resampling resampling;
  Field observed, raw, height, adjusted;
};

Input read() {
  std::string name;
  std::cin >> name;
  const auto calendar = calendar::Calendar::from_cf(name, "input");
  std::string quantity;
  std::cin >> quantity;
  Options options;
  options.quantity = quantity == "precipitation" ? Quantity::precipitation : Quantity::temperature;
  options.paired = whole_number() != 0;
  options.wet_day = number();
  Resampling resampling;
  std::cin >> resampling.seed >> resampling.stream >> resampling.replicates;
  std::vector<calendar::Date> dates(static_cast<std::size_t>(whole_number()));
  for (calendar::Date& date : dates) date = {whole_number(), whole_number(), whole_number()};
  Input input{options, Days(calendar, dates), resampling, {}, {}, {}, {}};
  const int stations = whole_number();
  for (int k = 0; k < stations; ++k) {
    for (Field* field : {&input.observed, &input.raw, &input.height, &input.adjusted}) {
      field->push_back(numbers(dates.size()));
    }
  }
  return input;
}

void dump_season(const Input& in, const Season& season) {
  const Sample sample(in.days, season, in.options, in.observed[0], in.raw[0]);
  const SeasonScores scores = score_season(sample, in.resampling);
  print("facts", {double(scores.days), double(scores.years), double(scores.too_small)});
  for (const Estimate& e : scores.score) {
    print("score", {e.value.observed, e.value.modelled, e.value.value, e.interval.low, e.interval.high});
  }
  std::vector<Versions> stations;
  for (std::size_t k = 0; k < in.observed.size(); ++k) {
    stations.push_back(
        make_versions(in.days, season, in.options, in.observed[k], in.raw[k], in.height[k], in.adjusted[k]));
  }
  for (const Comparison& c : compare(stations, in.resampling)) {
    print("compare", {double(c.score), double(c.stations), double(c.left_out), double(c.years), c.raw, c.height,
                      c.adjusted, c.over_raw_interval.low, c.over_raw_interval.high, c.over_height_interval.low,
                      c.over_height_interval.high, double(c.verdict)});
  }
  for (const ChangeKind kind : {ChangeKind::difference, ChangeKind::ratio}) {
    const Change c =
        change_between(in.days, season, in.raw[0], in.adjusted[0], {1992, 2000}, {2001, 2012}, kind, in.resampling);
    print("change", {c.modelled, c.product, c.added, c.added_interval.low, c.added_interval.high, double(c.early_years),
                     double(c.late_years), double(c.kept)});
  }
  const auto distance = [](std::size_t i, std::size_t j) { return 1000 * std::fabs(double(i) - double(j)); };
  for (const CorrelationBin& bin :
       correlation_by_distance(in.days, season, in.observed, in.raw, distance, {500, 1500, 2500}, 100)) {
    print("correlation", {double(bin.pairs), bin.observed, bin.modelled});
  }
  if (in.options.quantity != Quantity::precipitation) return;
  const AreaScores area = score_area(in.days, season, in.observed, in.raw, {0, 1, 2}, in.resampling);
  std::vector<double> all{double(area.days), double(area.years), double(area.verdict)};
  for (const Estimate* e : {&area.variance, &area.percentile_95, &area.yearly_maximum}) {
    all.insert(all.end(), {e->value.observed, e->value.modelled, e->value.value, e->interval.low, e->interval.high});
  }
  print("area", all);
}

void run() {
  std::string what;
  while (std::cin >> what) {
    if (what == "gamma") {
      const std::vector<double> sample = numbers(static_cast<std::size_t>(whole_number()));
      const stats::Gamma thom = stats::fit_gamma_thom(sample), fit = stats::fit_gamma(sample);
      std::vector<double> all{stats::log_mean_excess(sample), thom.shape, thom.scale, fit.shape, fit.scale};
      for (const double p : {0.01, 0.5, 0.95}) all.push_back(stats::gamma_quantile(fit, p));
      for (const double x : {0.1, 1.0, 10.0}) all.push_back(stats::gamma_cdf(fit, x));
      print("gamma", all);
      continue;
    }
    const Input input = read();
    for (const Season& season : standard_seasons()) dump_season(input, season);
  }
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
