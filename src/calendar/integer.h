// Division that rounds down, so that days and years before zero behave like those after it.
#pragma once
#include <cstdint>

namespace windrow::calendar {

constexpr std::int64_t floor_div(std::int64_t a, std::int64_t b) {
  return a / b - (a % b != 0 && (a % b < 0) != (b < 0));
}
constexpr std::int64_t floor_mod(std::int64_t a, std::int64_t b) { return a - floor_div(a, b) * b; }

}  // namespace windrow::calendar
