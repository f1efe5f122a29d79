// [field.adjust] and [field.terrain].
#include <fmt/format.h>

#include "adjust_section.h"
#include "windrow/text/words.h"
#include "windrow/units/units.h"

namespace windrow::job {
namespace {

const Keys kAdjustKeys{{"method", "form", "observed", "period", "season", "day_step", "quantiles", "max_ratio", "tails",
                        "carry", "period_mismatch", "window", "window_step", "wet_day"},
                       {}};
const Keys kTerrainKeys{{"lapse", "model_height"}, {}};

calendar::Date date(const Table& table, const Value& written) {
  const bool texts = written.kind == Value::Kind::text || written.kind == Value::Kind::date;
  std::optional<calendar::Date> out;
  if (texts) {
    try {
      out = calendar::parse_date(written.text, table.title());
    } catch (const Error&) {
      out.reset();
    }
  }
  // Which days a month has depends on the model's calendar: the 30th of February exists in some.
  if (!out || out->month < 1 || out->month > 12 || out->day < 1 || out->day > 31)
    table.document().fail(written.at, fmt::format("{} is no date; expected one such as \"1981-01-31\"",
                                                  texts ? "'" + printable(written.text) + "'" : kind_name(written)));
  return *out;
}

std::optional<std::pair<calendar::Date, calendar::Date>> period(const Table& table) {
  const Value* value = table.find("period");
  if (value == nullptr) return std::nullopt;
  const std::string expected = "the first and the last day, such as [\"1981-01-01\", \"2010-12-31\"]";
  if (value->kind != Value::Kind::array) table.wrong_kind("period", *value, expected);
  if (value->items.size() != 2)
    table.fail("period", fmt::format("'period' has {} {}; expected {}", value->items.size(),
                                     value->items.size() == 1 ? "entry" : "entries", expected));
  const calendar::Date first = date(table, value->items[0]), last = date(table, value->items[1]);
  if (last < first)
    table.fail("period", fmt::format("'period' ends on {}, before it begins on {}; expected the first day first",
                                     calendar::to_string(last), calendar::to_string(first)));
  return std::pair{first, last};
}

void read_season(const Table& table, AdjustSpec& adjust) {
  if (const auto season = table.text("season")) {
    adjust.season_given = true;
    if (*season == "month") {
      adjust.season = SeasonKind::month;
    } else if (*season == "year") {
      adjust.season = SeasonKind::year;
    } else {
      const std::optional<int> days = text::parse_days(*season);
      if (!days) {
        const std::string nearest = text::nearest_word(*season, {"month", "year"});
        table.fail("season", fmt::format("unknown season '{}'; {}", printable(*season),
                                         nearest.empty() ? "expected month, year or a window such as \"31 days\""
                                                         : "did you mean '" + nearest + "'?"));
      }
      if (*days < 1 || *days > 365)
        table.fail("season", fmt::format("a window of {} days; expected 1 to 365 days", *days));
      adjust.window_days = *days;
    }
  }
  adjust.day_step = table.whole("day_step", adjust.day_step, 1, 365);
  if (adjust.season == SeasonKind::moving && adjust.day_step > adjust.window_days) {
    if (table.has("day_step"))
      table.fail("day_step", fmt::format("windows of {} days every {} days leave days out; expected 'day_step' of at "
                                         "most {}",
                                         adjust.window_days, adjust.day_step, adjust.window_days));
    adjust.day_step = adjust.window_days;
  }
}

/// The form a method has by itself; nothing where it has both.
std::optional<Form> form_of(Adjustment method) {
  switch (method) {
    case Adjustment::mean_shift:
    case Adjustment::variance_scaling:
      return Form::additive;
    case Adjustment::mean_ratio:
    case Adjustment::gamma_mapping:
      return Form::multiplicative;
    default:
      return std::nullopt;
  }
}

void read_form(const Table& table, AdjustSpec& adjust) {
  const bool form_given = table.has("form");
  adjust.form = table.word<Form>("form", {{{"additive", Form::additive}, {"multiplicative", Form::multiplicative}}, {}},
                                 Form::additive);
  adjust.method = table.word<Adjustment>("method",
                                         {{{"none", Adjustment::none},
                                           {"mean-shift", Adjustment::mean_shift},
                                           {"mean-ratio", Adjustment::mean_ratio},
                                           {"variance-scaling", Adjustment::variance_scaling},
                                           {"quantile-mapping", Adjustment::quantile_mapping},
                                           {"detrended-quantile-mapping", Adjustment::detrended_quantile_mapping},
                                           {"quantile-delta-mapping", Adjustment::quantile_delta_mapping},
                                           {"gamma-mapping", Adjustment::gamma_mapping}},
                                          {}},
                                         Adjustment::quantile_delta_mapping);
  if (adjust.method == Adjustment::none) return;
  const std::optional<Form> natural = form_of(adjust.method);
  if (form_given && natural && adjust.form != *natural)
    table.fail("form", fmt::format("method '{}' does not go with form '{}'; expected '{}'", table.text("method", ""),
                                   table.text("form", ""), *natural == Form::additive ? "additive" : "multiplicative"));
  if (natural) adjust.form = *natural;
}

void read_windows(const Table& table, AdjustSpec& adjust) {
  const auto years = [&](const char* key, int fallback) {
    const auto written = table.text(key);
    if (!written) return fallback;
    const std::optional<int> value = text::parse_years(*written);
    if (!value || *value < 1 || *value > 500)
      table.fail(key, fmt::format("'{}' is no number of years; expected one such as \"{} years\"", printable(*written),
                                  fallback));
    return *value;
  };
  adjust.window_years = years("window", adjust.window_years);
  adjust.window_step = years("window_step", adjust.window_step);
  if (adjust.window_step > adjust.window_years)
    table.fail(table.has("window_step") ? "window_step" : "window",
               fmt::format("a window of {} years stepped by {}; expected a step of at most the window",
                           adjust.window_years, adjust.window_step));
}

/// In the field's units; those of the source are not known here, so a field without units keeps what is written.
void read_wet_day(const Table& table, AdjustSpec& adjust) {
  const auto written = table.text("wet_day");
  if (!written) return;
  if (adjust.form != Form::multiplicative) table.fail("wet_day", "'wet_day' goes with form = \"multiplicative\"");
  const auto quantity = text::parse_quantity(*written);
  if (!quantity || quantity->second.empty() || !(quantity->first >= 0))
    table.fail("wet_day",
               fmt::format("'{}' is no wet-day threshold; expected one such as \"1 mm/day\"", printable(*written)));
  adjust.wet_day = *quantity;
}

// Units of one degree of height: those of the field (or K) over a metre. A lapse is a difference, so an offset of the
// units (degC) has no part in it.
double lapse_per_metre(const Table& table, double value, const std::string& units, const FieldSpec& field,
                       Position at) {
  const std::string numerator = field.units.empty() ? "K" : field.units;
  try {
    return value * units::conversion(units, "(" + numerator + ")/m", "", table.title()).affine.scale;
  } catch (const Error&) {
    table.document().fail(at, fmt::format("lapse units '{}' are not {} per length; expected a lapse such as \"-6.5 "
                                          "K/km\"",
                                          printable(units), printable(numerator)));
  }
}

std::array<double, 12> lapse(const Table& table, const FieldSpec& field) {
  std::array<double, 12> out{};
  const Value* value = table.find("lapse");
  if (value == nullptr) table.missing("lapse", "a lapse such as \"-6.5 K/km\", 12 of them, or \"fit\"");
  const auto one = [&](const Value& written) {
    if (written.kind == Value::Kind::text) {
      const auto quantity = text::parse_quantity(written.text);
      if (quantity && !quantity->second.empty())
        return lapse_per_metre(table, quantity->first, quantity->second, field, written.at);
    }
    const std::string found =
        written.kind == Value::Kind::text ? "'" + printable(written.text) + "'" : kind_name(written);
    table.document().fail(written.at,
                          fmt::format("{} is no lapse; expected a number with units, such as \"-6.5 K/km\"", found));
  };
  if (value->kind != Value::Kind::array) {
    out.fill(one(*value));
    return out;
  }
  if (value->items.size() != 12)
    table.fail("lapse", fmt::format("'lapse' has {} entries; expected one, or 12 monthly ones", value->items.size()));
  for (std::size_t month = 0; month < 12; ++month) {
    const Value& item = value->items[month];
    const bool bare = item.kind == Value::Kind::number || item.kind == Value::Kind::whole;
    // Bare monthly numbers are per kilometre, the trade's custom for lapse rates.
    out[month] = bare ? lapse_per_metre(table, item.number, field.units.empty() ? "K/km" : "(" + field.units + ")/km",
                                        field, item.at)
                      : one(item);
  }
  return out;
}

}  // namespace

AdjustSpec read_adjust(const Table& field_table, const FieldSpec& field) {
  AdjustSpec adjust;
  const std::optional<Table> table = field_table.table("adjust", "[field.adjust]", kAdjustKeys);
  if (!table) return adjust;
  read_form(*table, adjust);
  for (const auto& [column, at] : table->texts("observed")) adjust.observed.push_back(column);
  if (adjust.observed.empty()) adjust.observed = {field.name};
  if (adjust.observed.size() > 2)
    table->fail("observed", fmt::format("'observed' names {} station columns; expected one, or two to be averaged",
                                        adjust.observed.size()));
  adjust.period = period(*table);
  read_season(*table, adjust);
  read_windows(*table, adjust);
  read_wet_day(*table, adjust);
  adjust.quantiles = table->whole("quantiles", adjust.quantiles, 2, 1000);
  adjust.max_ratio = table->number("max_ratio", adjust.max_ratio, 1, 1e6);
  table->word<int>("tails", {{{"constant", 0}}, {}}, 0);
  adjust.carry =
      table->word<Carry>("carry", {{{"target", Carry::target}, {"correction", Carry::correction}}, {}}, Carry::target);
  adjust.accept_period_mismatch =
      table->word<bool>("period_mismatch", {{{"refuse", false}, {"accept", true}}, {}}, false);
  return adjust;
}

std::optional<TerrainSpec> read_terrain(const Table& field_table, const FieldSpec& field) {
  const std::optional<Table> table = field_table.table("terrain", "[field.terrain]", kTerrainKeys);
  if (!table) return std::nullopt;
  TerrainSpec terrain;
  terrain.fit = table->find("lapse") != nullptr && table->find("lapse")->kind == Value::Kind::text &&
                table->find("lapse")->text == "fit";
  if (terrain.fit && field.adjust.method == Adjustment::none)
    table->fail("lapse", "a lapse is fitted to stations; expected [field.adjust], or a lapse such as \"-6.5 K/km\"");
  if (!terrain.fit) terrain.lapse_per_m = lapse(*table, field);
  if (!table->has("model_height")) table->missing("model_height", "the model's own heights (a NetCDF file)");
  terrain.model_height = table->path("model_height");
  return terrain;
}

}  // namespace windrow::job
