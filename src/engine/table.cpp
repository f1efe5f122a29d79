#include "table.h"

#include <fmt/format.h>

#include "windrow/cf/product.h"
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
std::string date_text(const Series& axis, std::size_t step) {
  if (axis.frequency == cf::Frequency::daily) return calendar::to_string(axis.dates[step]);
  if (axis.frequency == cf::Frequency::monthly) return calendar::to_string(axis.dates[step]).substr(0, 7);
  const calendar::Instant time = axis.time[step].time;
  const calendar::Date day = axis.calendar.date_of(time);
  const auto seconds = (time - axis.calendar.instant(day)) / 1'000'000;
  return fmt::format("{}T{:02d}:{:02d}:{:02d}", calendar::to_string(day), seconds / 3600, seconds / 60 % 60,
                     seconds % 60);
}

}  // namespace

std::string table_path(const std::string& product_path) {
  const bool netcdf = product_path.ends_with(".nc");
  return (netcdf ? product_path.substr(0, product_path.size() - 3) : product_path) + ".csv";
}

void write_table(const Product& product, const Series& axis, const std::string& variable, const std::string& units,
                 const std::vector<std::string>& ids, float missing) {
  const bool fixed = axis.frequency == cf::Frequency::fixed;
  std::string text = fixed ? "" : "date";
  for (const auto& id : ids) {
    if (!text.empty()) text += ",";
    text += cell_text(fmt::format("{} [{}]", id, units));
  }
  text += "\r\n";
  const auto reader = cf::open_product(product.path);
  std::vector<float> values;
  for (std::size_t t = product.span.t0; t < product.span.t1; ++t) {
    reader->read_steps(variable, t - product.span.t0, t - product.span.t0 + 1, values);
    if (!fixed) text += date_text(axis, t);
    for (std::size_t k = 0; k < values.size(); ++k) {
      if (k > 0 || !fixed) text += ",";
      if (values[k] != missing) fmt::format_to(std::back_inserter(text), "{}", values[k]);
    }
    text += "\r\n";
  }
  os::replace_file(table_path(product.path), text);
}

}  // namespace windrow::engine
