// [reach]: how a station's correction reaches the cells between stations, and how far.
#include <fmt/format.h>

#include "sections.h"
#include "windrow/text/words.h"
#include "windrow/units/units.h"

namespace windrow::job {

const Keys kReachKeys{{"method", "radius", "power", "beyond", "neighbours", "variogram"}, {}};

namespace {

const Keys kVariogramKeys{{"model", "nugget", "sill", "range"}, {}};

double distance_m(const Table& table, const std::string& key, double otherwise) {
  const std::optional<std::string> written = table.text(key);
  if (!written) return otherwise;
  std::optional<double> metres;
  if (const auto quantity = text::parse_quantity(*written)) {
    try {
      metres = units::conversion(quantity->second, "m", "", table.title()).affine(quantity->first);
    } catch (const Error&) {
      metres.reset();
    }
  }
  if (!metres || !(*metres > 0) || *metres > 1e8)
    table.fail(key, fmt::format("'{}' is no distance; expected one such as \"300 km\"", printable(*written)));
  return *metres;
}

VariogramSpec read_variogram(const Table& reach) {
  VariogramSpec out;
  const Value* written = reach.find("variogram");
  if (written == nullptr) return out;
  if (written->kind == Value::Kind::text) {
    if (written->text != "fit")
      reach.fail("variogram", fmt::format("'{}' is no variogram; expected \"fit\" or {{ model, nugget, sill, range }}",
                                          printable(written->text)));
    return out;
  }
  const std::optional<Table> table = reach.table("variogram", "'variogram' of [reach]", kVariogramKeys);
  out.model = table->word<VariogramModel>("model",
                                          {{{"exponential", VariogramModel::exponential},
                                            {"spherical", VariogramModel::spherical},
                                            {"gaussian", VariogramModel::gaussian}},
                                           {}},
                                          out.model);
  out.fit = !table->has("nugget") && !table->has("sill") && !table->has("range");
  if (out.fit) return out;
  for (const char* key : {"sill", "range"}) {
    if (!table->has(key))
      table->missing(key, "nugget, sill and range together, or none of them: then the model is fitted");
  }
  out.sill = table->number("sill", out.sill, 1e-12, 1e12);
  out.nugget = table->number("nugget", 0, 0, 1e12);
  if (out.nugget > out.sill)
    table->fail("nugget",
                fmt::format("a nugget of {} above the sill of {}; expected at most the sill, which is the total",
                            out.nugget, out.sill));
  out.range_m = distance_m(*table, "range", out.range_m);
  return out;
}

}  // namespace

ReachSpec read_reach(const Table& table) {
  ReachSpec reach;
  reach.method = table.word<ReachMethod>("method",
                                         {{{"nearest", ReachMethod::nearest},
                                           {"inverse-distance", ReachMethod::inverse_distance},
                                           {"kriging", ReachMethod::kriging},
                                           {"kriging-height", ReachMethod::kriging_height}},
                                          {}},
                                         reach.method);
  reach.radius_m = distance_m(table, "radius", reach.radius_m);
  reach.power = table.number("power", reach.power, 0.1, 16);
  reach.beyond = table.word<Beyond>(
      "beyond", {{{"taper", Beyond::taper}, {"raw", Beyond::raw}, {"missing", Beyond::missing}}, {}}, reach.beyond);
  reach.neighbours = table.whole("neighbours", reach.neighbours, 1, 10000);
  reach.variogram = read_variogram(table);
  if (table.has("variogram") && !reach.kriges())
    table.fail("variogram", "'variogram' goes with method \"kriging\" or \"kriging-height\"");
  return reach;
}

}  // namespace windrow::job
