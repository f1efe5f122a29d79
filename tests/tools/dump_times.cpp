// Test helper: decodes and encodes times line by line, for comparison with another implementation.
// Input, fields separated by tabs:   decode CALENDAR UNITS VALUE   ->   YEAR MONTH DAY MICROSECOND_OF_DAY
//                                    encode CALENDAR UNITS YEAR-MONTH-DAY MICROSECOND_OF_DAY   ->   VALUE
// A refusal prints "refused: " and its message.
#include <cstdio>
#include <iostream>
#include <sstream>

#include "windrow/base/error.h"
#include "windrow/calendar/time_units.h"

using namespace windrow::calendar;

int main() {
  for (std::string line; std::getline(std::cin, line);) {
    std::istringstream fields(line);
    std::string action, name, units_text, value, clock;
    for (std::string* field : {&action, &name, &units_text, &value, &clock}) std::getline(fields, *field, '\t');
    try {
      const Calendar calendar = Calendar::from_cf(name, "line");
      const TimeUnits units = TimeUnits::parse(units_text, calendar, "line");
      if (action == "decode") {
        const Instant instant = units.decode(std::stod(value));
        const Date date = calendar.date_of(instant);
        std::printf("%d %d %d %lld\n", date.year, date.month, date.day,
                    static_cast<long long>(instant - calendar.instant(date)));
      } else {
        std::printf("%.17g\n", units.encode(calendar.instant(parse_date(value, "line")) + std::stoll(clock)));
      }
    } catch (const windrow::Error& error) {
      std::printf("refused: %s\n", error.what());
    }
  }
}
