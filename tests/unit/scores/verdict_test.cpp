// Laws of the comparison of raw, height-adjusted and adjusted series, and the wording of verdicts.
#include <doctest/doctest.h>

#include <algorithm>
#include <stdexcept>

#include "series.h"
#include "windrow/base/error.h"
#include "windrow/scores/verdict.h"

using namespace windrow;
using namespace windrow::scores;
using invented::kNaN;
using invented::season;

namespace {

const Resampling kDraws{5, 0, 200};
constexpr Options kFree{Quantity::temperature, false, 1.0};

std::vector<double> plus(std::vector<double> series, double constant) {
  for (double& v : series) v += constant;
  return series;
}

/// Stations with a free model whose three versions are off by the given numbers of K.
std::vector<Versions> network(const Days& days, std::size_t stations, double raw, double height, double adjusted) {
  std::vector<Versions> out;
  for (std::size_t k = 0; k < stations; ++k) {
    const auto observed = invented::temperature(days, 10, 2, 100 + k),
               model = invented::temperature(days, 10, 2, 200 + k);
    out.push_back(make_versions(days, season("JJA"), kFree, observed, plus(model, raw), plus(model, height),
                                plus(model, adjusted)));
  }
  return out;
}

const Comparison& of(const std::vector<Comparison>& all, Score score) {
  for (const Comparison& one : all) {
    if (one.score == score) return one;
  }
  throw std::logic_error("no such score");
}

}  // namespace

TEST_CASE("an adjustment that removes a bias helps, one that makes one harms, none makes no difference") {
  const Days days = invented::years(1981, 2000);
  const auto helped = compare(network(days, 4, 5, 3, 0), kDraws), harmed = compare(network(days, 4, 5, 0, 3), kDraws),
             same = compare(network(days, 4, 5, 2, 2), kDraws);
  CHECK(of(helped, Score::bias).verdict == Verdict::helps);
  CHECK(of(helped, Score::perkins).verdict == Verdict::helps);
  CHECK(of(helped, Score::bias).over_height_interval.low > 2);
  CHECK(of(helped, Score::bias).over_raw == doctest::Approx(of(helped, Score::bias).over_height + 2).epsilon(1e-10));
  CHECK(of(helped, Score::variance_ratio).verdict == Verdict::no_clear_difference);
  CHECK(of(harmed, Score::bias).verdict == Verdict::harms);
  CHECK(of(same, Score::bias).verdict == Verdict::no_clear_difference);
  CHECK(of(same, Score::bias).over_height == 0);
  CHECK(overall(helped, Quantity::temperature) == Verdict::helps);
  CHECK(overall(harmed, Quantity::temperature) == Verdict::harms);
  CHECK(overall(same, Quantity::temperature) == Verdict::no_clear_difference);
}

TEST_CASE("a bias exchanged for its opposite is no clear difference") {
  const Days days = invented::years(1981, 2000);
  const auto all = compare(network(days, 6, 1, 0.3, -0.3), kDraws);
  CHECK(of(all, Score::bias).verdict == Verdict::no_clear_difference);
}

TEST_CASE("scores that need corresponding days are compared only where days correspond") {
  const Days days = invented::years(1981, 1992);
  const auto all = compare(network(days, 1, 1, 1, 0), kDraws);
  for (const Comparison& one : all) {
    CHECK(one.score != Score::mean_absolute_error);
    CHECK(one.score != Score::root_mean_square_error);
    CHECK(one.score != Score::wet_day_frequency);
  }
  CHECK(all.size() == kScores - 4);
}

TEST_CASE("stations of few years are left out, and none left is too small a sample") {
  const Days days = invented::years(1981, 1992);
  std::vector<Versions> stations = network(days, 2, 3, 3, 0);
  auto observed = invented::temperature(days, 10, 2, 300);
  const auto model = invented::temperature(days, 10, 2, 301);
  for (std::size_t i = 0; i < days.size(); ++i) {
    if (days.date(i).year > 1989) observed[i] = kNaN;
  }
  const Versions brief = make_versions(days, season("JJA"), kFree, observed, model, model, model);
  stations.push_back(brief);
  const auto all = compare(stations, kDraws);
  CHECK(of(all, Score::bias).stations == 2);
  CHECK(of(all, Score::bias).left_out == 1);
  CHECK(of(all, Score::bias).years == 12);
  const auto none = compare(std::vector<Versions>{brief}, kDraws);
  CHECK(of(none, Score::bias).verdict == Verdict::too_small);
  CHECK(overall(none, Quantity::temperature) == Verdict::too_small);
  CHECK(compare({}, kDraws).empty());
  CHECK(overall({}, Quantity::temperature) == Verdict::too_small);
  CHECK(sentence(of(none, Score::bias), "tas", season("JJA"), "K") ==
        "tas, JJA, bias: sample too small: 0 stations with at least 10 years, 1 left out");
  CHECK(overall_sentence(none, "tas", season("JJA"), kFree) == "tas, JJA: sample too small: no station has 10 years");
}

TEST_CASE("all versions are scored on the days that none of them lacks") {
  const Days days = invented::years(1981, 1983);
  const auto observed = invented::temperature(days, 10, 2, 1), model = invented::temperature(days, 10, 2, 2);
  auto raw = model, height = model, adjusted = model;
  raw[200] = height[201] = adjusted[202] = kNaN;
  const Versions one = make_versions(days, season("year"), kFree, observed, raw, height, adjusted);
  CHECK(one.raw.days() == days.size() - 3);
  CHECK(one.height.days() == days.size() - 3);
  CHECK(at(one.raw.scores(), Score::bias).value == at(one.adjusted.scores(), Score::bias).value);
  raw.pop_back();
  CHECK_THROWS_AS((void)make_versions(days, season("year"), kFree, observed, raw, height, adjusted), Error);
}

TEST_CASE("the order of stations does not change the verdict's interval beyond rounding, common years widen it") {
  const Days days = invented::years(1981, 2000);
  std::vector<Versions> stations = network(days, 3, 2, 2, 1);
  const Comparison there = of(compare(stations, kDraws), Score::bias);
  std::reverse(stations.begin(), stations.end());
  const Comparison back = of(compare(stations, kDraws), Score::bias);
  CHECK(there.over_height_interval.low == doctest::Approx(back.over_height_interval.low).epsilon(1e-13));
  CHECK(there.adjusted == doctest::Approx(back.adjusted).epsilon(1e-13));
  // The same station nine times over is no larger a sample: years are drawn for all together.
  const std::vector<Versions> copies(9, stations[0]);
  const Comparison one = of(compare(std::span(copies).first(1), kDraws), Score::percentile_95);
  const Comparison nine = of(compare(copies, kDraws), Score::percentile_95);
  CHECK(nine.over_height_interval.low == doctest::Approx(one.over_height_interval.low).epsilon(1e-13));
  CHECK(nine.over_height_interval.high == doctest::Approx(one.over_height_interval.high).epsilon(1e-13));
}

TEST_CASE("the main scores alone decide the season, and harm outweighs help") {
  const auto made = [](Score score, Verdict verdict) {
    Comparison one{};
    one.score = score;
    one.verdict = verdict;
    return one;
  };
  using V = Verdict;
  const std::vector<Comparison> mixed = {made(Score::bias, V::helps), made(Score::perkins, V::harms)};
  CHECK(overall(mixed, Quantity::temperature) == V::harms);
  const std::vector<Comparison> other = {made(Score::bias, V::no_clear_difference),
                                         made(Score::variance_ratio, V::harms),
                                         made(Score::wet_day_frequency, V::helps)};
  CHECK(overall(other, Quantity::temperature) == V::no_clear_difference);
  CHECK(overall(other, Quantity::precipitation) == V::helps);
}

TEST_CASE("verdicts read as plain sentences") {
  Comparison one{Score::bias, 12, 0, 30, 3.021, 2.128, 0.4102, 2.611, 1.718, {2, 3}, {1.352, 2.0604}, Verdict::helps};
  CHECK(sentence(one, "tas", season("DJF"), "K") ==
        "tas, DJF, bias: the adjustment helps: 0.41 K off instead of 2.13 K with height adjustment alone (3.02 K raw); "
        "improvement 1.72 K, 90 % interval 1.35 to 2.06 K; 12 stations, 30 years");
  one.verdict = Verdict::no_clear_difference;
  one.score = Score::variance_ratio;
  one.stations = 1;
  CHECK(
      sentence(one, "tas", season("DJF"), "K") ==
      "tas, DJF, variance ratio: no clear difference: 0.41 off 1 (as logarithm) instead of 2.13 with height adjustment "
      "alone (3.02 raw); improvement 1.72, 90 % interval 1.35 to 2.06; 1 station, 30 years");
  Comparison two = one;
  one.score = Score::bias;
  one.verdict = Verdict::helps;
  two.score = Score::perkins;
  const std::vector<Comparison> both = {one, two};
  CHECK(overall_sentence(both, "tas", season("year"), Options{Quantity::temperature, true}) ==
        "tas, year: the adjustment helps beyond height adjustment alone (bias helps, Perkins skill score no clear "
        "difference)");
  two.verdict = Verdict::harms;
  const std::vector<Comparison> harmed = {one, two};
  CHECK(overall_sentence(harmed, "tas", season("year"), Options{}) ==
        "tas, year: the adjustment harms: height adjustment alone is better (bias helps, Perkins skill score harms); "
        "distributions only: the model's days are not the observed ones, no skill is claimed");
}
