// Test only: reads a CF grid mapping and projects points with it. Standard input, one a line: "name NAME", "units
// UNITS", "text KEY VALUE", "number KEY VALUE...", "point LON LAT". Prints JSON, or the error on standard error with
// status 65.
#include <fmt/format.h>

#include <iostream>
#include <sstream>
#include <string>

#include "windrow/base/error.h"
#include "windrow/geo/crs.h"

namespace {

std::string list(const std::vector<double>& x, const std::vector<double>& y) {
  std::string out;
  for (std::size_t i = 0; i < x.size(); ++i) out += fmt::format("{}[{:.17g}, {:.17g}]", i ? ", " : "", x[i], y[i]);
  return "[" + out + "]";
}

}  // namespace

int main() {
  windrow::geo::GridMapping mapping;
  std::string units, line;
  std::vector<double> x, y;
  while (std::getline(std::cin, line)) {
    std::istringstream in(line);
    std::string kind, key;
    in >> kind;
    if (kind == "name") in >> mapping.name;
    if (kind == "units") std::getline(in >> std::ws, units);
    if (kind == "text") {
      std::string value;
      in >> key;
      std::getline(in >> std::ws, value);
      mapping.attributes.emplace_back(key, value);
    }
    if (kind == "number") {
      in >> key;
      std::vector<double> values;
      for (double v = 0; in >> v;) values.push_back(v);
      if (values.size() == 1)
        mapping.attributes.emplace_back(key, values.front());
      else
        mapping.attributes.emplace_back(key, values);
    }
    if (kind == "point") {
      double lon = 0, lat = 0;
      in >> lon >> lat;
      x.push_back(lon);
      y.push_back(lat);
    }
  }
  try {
    const windrow::geo::Crs crs = windrow::geo::crs_from_mapping(mapping, units, "dump_mapping");
    crs.from_geographic(x, y);
    std::cout << "{\"projected\": " << list(x, y);
    crs.to_geographic(x, y);
    std::cout << ", \"back\": " << list(x, y) << "}\n";
  } catch (const windrow::Error& e) {
    std::cerr << e.what() << '\n';
    return 65;
  }
  return 0;
}
