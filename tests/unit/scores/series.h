// Invented daily series for the tests of scores: dates of whole years, and random values of pinned seeds.
#pragma once
#include <cmath>
#include <random>
#include <stdexcept>
#include <string>
#include <vector>

#include "windrow/scores/scores.h"

namespace windrow::scores::invented {

inline const double kNaN = std::nan("");

inline std::vector<calendar::Date> dates(const calendar::Calendar& calendar, int first, int last) {
  std::vector<calendar::Date> out;
  for (int year = first; year <= last; ++year) {
    for (int month = 1; month <= 12; ++month) {
      for (int day = 1; day <= calendar.days_in_month(year, month); ++day) out.push_back({year, month, day});
    }
  }
  return out;
}

inline Days years(int first, int last, const std::string& name = "standard") {
  const auto calendar = calendar::Calendar::from_cf(name, "test");
  return Days(calendar, dates(calendar, first, last));
}

/// A yearly cycle and red noise; K about `mean`.
inline std::vector<double> temperature(const Days& days, double mean, double spread, std::uint64_t seed) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> noise;
  std::vector<double> out;
  double red = 0;
  for (std::size_t i = 0; i < days.size(); ++i) {
    red = 0.7 * red + noise(random);
    out.push_back(mean + 8 * std::sin(days.date(i).month * 0.5236) + spread * red);
  }
  return out;
}

/// Rain on about four days in ten; mm/day.
inline std::vector<double> rain(const Days& days, double scale, std::uint64_t seed) {
  std::mt19937_64 random(seed);
  std::gamma_distribution<double> amount(0.7, scale);
  std::vector<double> out;
  for (std::size_t i = 0; i < days.size(); ++i) out.push_back(random() % 10 < 4 ? amount(random) : 0);
  return out;
}

inline const Season& season(const std::string& name) {
  static const std::vector<Season> all = standard_seasons();
  for (const Season& one : all) {
    if (one.name == name) return one;
  }
  throw std::logic_error("no season " + name);
}

}  // namespace windrow::scores::invented
