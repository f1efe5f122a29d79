#include "table.h"

#include <fmt/format.h>

#include "windrow/os/files.h"

namespace windrow::engine {
namespace {

/// RFC 4180: quoted where a separator, a quote or a line break is inside.
std::string cell_text(const std::string& text) {
  if (text.find_first_of(",\"\n\r") == std::string::npos) return text;
  std::string out = "\"";
  for (const char c : text) {
    if (c == '"') out += '"';
    out += c;
  }
  return out + "\"";
}

/// The day, the month of monthly means, or day and time of anything shorter.
std::string date_text(const cf::RunVariable& variable, std::size_t step, const calendar::Date& middle) {
  const auto& time = variable.time()[step];
  if (variable.frequency() == cf::Frequency::daily) return calendar::to_string(middle);
  if (variable.frequency() == cf::Frequency::monthly) return calendar::to_string(middle).substr(0, 7);
  const calendar::Instant of_day = time.time - variable.calendar().instant(variable.calendar().date_of(time.time));
  const auto seconds = of_day / 1'000'000;
  return fmt::format("{}T{:02d}:{:02d}:{:02d}", calendar::to_string(variable.calendar().date_of(time.time)),
                     seconds / 3600, seconds / 60 % 60, seconds % 60);
}

}  // namespace

std::string table_path(const std::string& product_path) {
  const bool netcdf = product_path.ends_with(".nc");
  return (netcdf ? product_path.substr(0, product_path.size() - 3) : product_path) + ".csv";
}

void write_table(const StageContext& context, const Product& product) {
  const auto& variable = *context.source.variable;
  const bool fixed = variable.frequency() == cf::Frequency::fixed;
  const auto dates = step_dates(variable);
  const auto& name = context.session.job.fields[context.field].name;
  std::string text = fixed ? "" : "date";
  for (const auto& id : context.target.ids) {
    if (!text.empty()) text += ",";
    text += cell_text(fmt::format("{} [{}]", id, context.output_units));
  }
  text += "\r\n";
  const auto reader = cf::open_product(product.path);
  std::vector<float> values;
  for (std::size_t t = product.span.t0; t < product.span.t1; ++t) {
    reader->read_steps(name, t - product.span.t0, t - product.span.t0 + 1, values);
    if (!fixed) text += date_text(variable, t, dates[t]);
    for (std::size_t k = 0; k < values.size(); ++k) {
      if (k > 0 || !fixed) text += ",";
      if (values[k] != context.input.field.missing) fmt::format_to(std::back_inserter(text), "{}", values[k]);
    }
    text += "\r\n";
  }
  os::replace_file(table_path(product.path), text);
}

}  // namespace windrow::engine
