// Days of the demo's period, in the real calendar and in 365-day years.
#pragma once

namespace demo {

inline constexpr bool is_leap(int year) { return (year % 4 == 0 && year % 100 != 0) || year % 400 == 0; }

/// One day after the other from 1 January of the first year.
struct Day {
  bool noleap = false;
  int year = 0, of_year = 0;  // of_year from 0
  int number = 0;             // days since the first day
  [[nodiscard]] int year_length() const { return !noleap && is_leap(year) ? 366 : 365; }
  [[nodiscard]] double phase() const { return (of_year + 0.5) / year_length(); }
  [[nodiscard]] double decades() const { return (number + 0.5) / (noleap ? 3650.0 : 3652.5); }
  void next() {
    ++number;
    if (++of_year == year_length()) {
      of_year = 0;
      ++year;
    }
  }
};

}  // namespace demo
