// Test only: prints what geo makes of a CRS definition as JSON, and projects points given as "longitude,latitude".
#include <cstdio>
#include <iostream>
#include <string>

#include <fmt/format.h>

#include "windrow/base/error.h"
#include "windrow/geo/crs.h"

namespace {

std::string quoted(const std::string& text) {
  std::string out = "\"";
  for (const char c : text) {
    if (c == '"' || c == '\\') out += '\\';
    out += c;
  }
  return out + "\"";
}

std::string json(const std::variant<std::string, double, std::vector<double>>& value) {
  if (const auto* text = std::get_if<std::string>(&value)) return quoted(*text);
  if (const auto* number = std::get_if<double>(&value)) return fmt::format("{:.17g}", *number);
  std::string out;
  for (const double v : std::get<std::vector<double>>(value))
    out += fmt::format("{}{:.17g}", out.empty() ? "" : ", ", v);
  return "[" + out + "]";
}

}  // namespace

int main(int argc, char** argv) {
  if (argc < 2) return 64;
  try {
    const windrow::geo::Crs crs = windrow::geo::make_crs(argv[1], "dump_crs");
    std::vector<double> x, y;
    for (int i = 2; i < argc; ++i) {
      const std::string pair = argv[i];
      x.push_back(std::stod(pair));
      y.push_back(std::stod(pair.substr(pair.find(',') + 1)));
    }
    crs.from_geographic(x, y);
    std::cout << "{\"wkt\": " << quoted(crs.wkt) << ", \"units\": " << quoted(crs.units)
              << ", \"grid_mapping_name\": " << quoted(crs.grid_mapping.name);
    for (const auto& [name, value] : crs.grid_mapping.attributes)
      std::cout << ", " << quoted(name) << ": " << json(value);
    std::cout << ", \"points\": [";
    for (std::size_t i = 0; i < x.size(); ++i)
      std::cout << (i ? ", " : "") << fmt::format("[{:.17g}, {:.17g}]", x[i], y[i]);
    std::cout << "]}\n";
  } catch (const windrow::Error& e) {
    std::cerr << e.what() << '\n';
    return 65;
  }
  return 0;
}
