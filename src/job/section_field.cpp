// [[field]]: which variable is carried, in which units and how missing parts are treated.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>

#include "adjust_section.h"
#include "sections.h"
#include "windrow/units/units.h"

namespace windrow::job {

const Keys kFieldKeys{{"variable", "name", "units", "method", "quantity", "min_cover", "min_land", "fill", "range",
                       "pair", "axes", "adjust", "terrain"},
                      {"vertical"}};

namespace {

const std::vector<std::pair<std::string, Method>> kMethods{{"conservative-1", Method::conservative_1},
                                                           {"conservative-2", Method::conservative_2},
                                                           {"conservative-smooth", Method::conservative_smooth},
                                                           {"bilinear", Method::bilinear},
                                                           {"nearest", Method::nearest},
                                                           {"majority", Method::majority}};

// Dimensions and variables that products have of their own.
const std::vector<std::string> kTaken{"time",      "lat",         "lon",      "x",        "y",         "crs",
                                      "cover",     "cell_area",   "lat_bnds", "lon_bnds", "x_bnds",    "y_bnds",
                                      "time_bnds", "status_flag", "rlat",     "rlon",     "rlat_bnds", "rlon_bnds",
                                      "catchment", "town",        "face",     "mesh"};

void check_variable_name(const Table& table, const FieldSpec& field) {
  const std::string key = table.has("name") ? "name" : "variable";
  const std::string& name = field.name;
  const bool fits =
      !name.empty() && name.size() <= 100 && std::isalpha(static_cast<unsigned char>(name.front())) != 0 &&
      std::all_of(name.begin(), name.end(), [](unsigned char c) { return std::isalnum(c) != 0 || c == '_'; });
  if (!fits)
    table.fail(key, fmt::format("'{}' cannot be a variable's name in the product; expected a 'name' of letters, digits "
                                "and '_', a letter first",
                                printable(name)));
  if (std::find(kTaken.begin(), kTaken.end(), name) != kTaken.end())
    table.fail(key, fmt::format("'{}' is a name that products use themselves; expected another 'name'", name));
}

}  // namespace

void check_units(const Table& table, const std::string& key) {
  const std::optional<std::string> written = table.text(key);
  if (!written) return;
  std::string odd;
  const bool good = written->size() <= 200 && !written->empty() && units::known(units::repaired(*written, &odd));
  if (!good)
    table.fail(key, fmt::format("units '{}' are not known to UDUNITS; expected units such as degC, mm/day or m s-1",
                                printable(*written)));
}

std::string method_word(Method method) { return kMethods[static_cast<std::size_t>(method)].first; }

FieldSpec read_field(const Table& table) {
  FieldSpec field;
  const std::optional<std::string> variable = table.text("variable");
  if (!variable) table.missing("variable", "the name of a variable in the model files");
  if (variable->empty())
    table.fail("variable", "'variable' is empty; expected the name of a variable in the model files");
  field.variable = *variable;
  field.name = table.text("name", field.variable);
  check_variable_name(table, field);
  field.units = table.text("units", "");
  check_units(table, "units");
  field.method = table.word<Method>("method", {kMethods, {}}, Method::conservative_1);
  field.total = table.word<bool>("quantity", {{{"mean", false}, {"total", true}}, {}}, false);
  field.min_cover = table.number("min_cover", field.min_cover, 0, 1);
  field.min_land = table.number("min_land", field.min_land, 0, 1);
  field.fill_nearest = table.word<bool>("fill", {{{"none", false}, {"nearest", true}}, {}}, false);
  if (const auto range = table.numbers("range", 2)) {
    if ((*range)[0] >= (*range)[1])
      table.fail("range",
                 fmt::format("'range' goes from {} to {}; expected the lower end first", (*range)[0], (*range)[1]));
    field.range = {(*range)[0], (*range)[1]};
  }
  field.pair =
      table.word<Pair>("pair", {{{"eastward", Pair::eastward}, {"northward", Pair::northward}}, {}}, Pair::none);
  field.axes = table.word<VectorAxes>(
      "axes", {{{"east-north", VectorAxes::east_north}, {"mesh", VectorAxes::mesh}}, {}}, VectorAxes::east_north);
  field.adjust = read_adjust(table, field);
  field.terrain = read_terrain(table, field);
  if (field.total && field.adjust.method != Adjustment::none)
    table.fail("quantity",
               "a cell sum cannot be adjusted to stations, which measure at points; expected quantity \"mean\"");
  if (field.terrain && field.adjust.method != Adjustment::none && field.adjust.form == Form::multiplicative)
    table.fail("terrain",
               "[field.terrain] adds to the values and does not go with multiplicative corrections; expected "
               "form = \"additive\", or no [field.terrain]");
  return field;
}

}  // namespace windrow::job
