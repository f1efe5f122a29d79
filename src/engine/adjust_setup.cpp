#include "adjust_setup.h"

#include <fmt/format.h>

#include "station_tables.h"
#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

adjust::Method method_of(job::Adjustment method) {
  switch (method) {
    case job::Adjustment::mean_ratio:
      return adjust::Method::mean_ratio;
    case job::Adjustment::variance_scaling:
      return adjust::Method::variance_scaling;
    case job::Adjustment::quantile_mapping:
      return adjust::Method::quantile_mapping;
    case job::Adjustment::detrended_quantile_mapping:
      return adjust::Method::detrended_quantile_mapping;
    case job::Adjustment::quantile_delta_mapping:
      return adjust::Method::quantile_delta_mapping;
    case job::Adjustment::gamma_mapping:
      return adjust::Method::gamma_mapping;
    default:
      return adjust::Method::mean_shift;
  }
}

/// The wet-day threshold in output units; 0: none. 1 mm/day for precipitation by the quantile methods, unless given.
double wet_day_of(const job::AdjustSpec& spec, const units::Conversion& conversion, const std::string& output_units,
                  const std::string& place) {
  if (spec.form != job::Form::multiplicative) return 0;
  const bool rain = is_precipitation(conversion.standard_name) && is_rate(output_units);
  if (!spec.wet_day) {
    const bool by_itself = rain && spec.method != job::Adjustment::mean_ratio;
    return by_itself ? units::conversion("mm/day", output_units, "", place).affine(1.0) : 0;
  }
  try {
    return units::conversion(spec.wet_day->second, output_units, "", place).affine(spec.wet_day->first);
  } catch (const Error&) {
    throw Error(Failure::job, place,
                fmt::format("wet_day is in '{}', the field in '{}'; expected a threshold in units that convert",
                            spec.wet_day->second, output_units));
  }
}

}  // namespace

bool is_rate(const std::string& units) {
  for (const char* rate : {"m s-1", "kg m-2 s-1"}) {
    try {
      units::conversion(units, rate, "", "");
      return true;
    } catch (const Error&) {
      continue;
    }
  }
  return false;
}

adjust::Setup adjust_setup(const job::AdjustSpec& spec, const cf::RunVariable& variable,
                           const units::Conversion& conversion, const std::string& output_units,
                           const std::string& place) {
  adjust::Setup out;
  const auto frequency = variable.frequency();
  if (frequency != cf::Frequency::daily && frequency != cf::Frequency::monthly) {
    throw Error(Failure::data, place, "adjustment needs daily or monthly means; this variable has neither");
  }
  out.daily = frequency == cf::Frequency::daily;
  out.method = method_of(spec.method);
  out.ratio_form = spec.form == job::Form::multiplicative;
  out.window_years = spec.window_years;
  out.window_step = spec.window_step;
  out.wet_day = wet_day_of(spec, conversion, output_units, place);
  if (!out.daily && spec.season_given && spec.season != job::SeasonKind::month) {
    throw Error(Failure::data, place, "monthly values need season = \"month\"");
  }
  out.seasons = !out.daily || spec.season == job::SeasonKind::month ? calendar::Seasons::by_month()
                : spec.season == job::SeasonKind::year              ? calendar::Seasons::by_year()
                                                       : calendar::Seasons::moving(spec.window_days, spec.day_step);
  out.quantiles = spec.quantiles;
  out.max_ratio = spec.max_ratio;
  out.carry_target = spec.carry == job::Carry::target;
  return out;
}

}  // namespace windrow::engine
