#include "windrow/report/ledger.h"

#include <nlohmann/json.hpp>

#include "windrow/base/error.h"

namespace windrow::report {
namespace {

using Json = nlohmann::ordered_json;

template <typename T>
Json object(const std::vector<std::pair<std::string, T>>& pairs) {
  Json out = Json::object();
  for (const auto& [name, value] : pairs) out[name] = value;
  return out;
}

template <typename T>
std::vector<std::pair<std::string, T>> pairs(const Json& json) {
  std::vector<std::pair<std::string, T>> out;
  for (const auto& [name, value] : json.items()) out.emplace_back(name, value.template get<T>());
  return out;
}

Json line(const BalanceLine& line) {
  return {{"period", line.period},   {"source", line.source}, {"product", line.product},
          {"below_min_cover", line.below}, {"filled", line.filled}, {"largest_relative_residual", line.relative}};
}

BalanceLine line_from(const Json& json) {
  return {json.at("period"), json.at("source"), json.at("product"), json.at("below_min_cover"), json.at("filled"),
          json.at("largest_relative_residual")};
}

}  // namespace

std::string to_json(const Ledger& ledger) {
  Json inputs = Json::array(), stations = Json::array(), notices = Json::array(), months = Json::array();
  for (const auto& input : ledger.inputs) {
    inputs.push_back({{"path", input.path}, {"xxh3_128", input.digest}, {"bytes", input.bytes}});
  }
  for (const auto& station : ledger.stations) stations.push_back({{"id", station.id}, {"outcome", station.outcome}});
  for (const auto& [place, text] : ledger.notices) notices.push_back({{"place", place}, {"text", text}});
  for (const auto& month : ledger.balance.months) months.push_back(line(month));
  Json balance = {{"statement", ledger.balance.statement}, {"kept", ledger.balance.kept}, {"all", line(ledger.balance.all)}, {"months", months}};
  if (ledger.balance.stored) balance["stored_float32_largest_relative_residual"] = ledger.balance.stored_relative;
  const Json json = {{"windrow_ledger", ledger.format},
                     {"windrow_version", ledger.version},
                     {"product", ledger.product},
                     {"product_bytes", ledger.product_bytes},
                     {"product_xxh3_128", ledger.product_digest},
                     {"product_version", ledger.product_version},
                     {"field", ledger.field},
                     {"run", ledger.run},
                     {"family", ledger.family},
                     {"forcing", ledger.forcing},
                     {"mesh", ledger.mesh},
                     {"minimum", ledger.minimum},
                     {"maximum", ledger.maximum},
                     {"balance", balance},
                     {"linear_map", ledger.linear_map},
                     {"cover", object(ledger.cover)},
                     {"counts", object(ledger.counts)},
                     {"stations", stations},
                     {"notices", notices},
                     {"inputs", inputs},
                     {"depends_on", object(ledger.key)},
                     {"settings", object(ledger.settings)},
                     {"libraries", object(ledger.libraries)},
                     {"cautions", ledger.cautions}};
  return json.dump(1, ' ', false, Json::error_handler_t::replace) + "\n";
}

Ledger parse_ledger(const std::string& text, const std::string& path) {
  try {
    const Json json = Json::parse(text);
    Ledger out;
    out.format = json.at("windrow_ledger");
    out.version = json.at("windrow_version");
    out.product = json.at("product");
    out.product_bytes = json.at("product_bytes");
    out.product_digest = json.at("product_xxh3_128");
    out.product_version = json.at("product_version");
    out.field = json.at("field");
    out.run = json.at("run");
    out.family = json.at("family");
    out.forcing = json.at("forcing");
    out.mesh = json.at("mesh");
    out.minimum = json.at("minimum");
    out.maximum = json.at("maximum");
    const Json& balance = json.at("balance");
    out.balance.statement = balance.at("statement");
    out.balance.kept = balance.value("kept", true);
    out.balance.all = line_from(balance.at("all"));
    for (const auto& month : balance.at("months")) out.balance.months.push_back(line_from(month));
    out.balance.stored = balance.contains("stored_float32_largest_relative_residual");
    if (out.balance.stored) out.balance.stored_relative = balance.at("stored_float32_largest_relative_residual");
    out.linear_map = json.at("linear_map");
    out.cover = pairs<double>(json.at("cover"));
    out.counts = pairs<std::int64_t>(json.at("counts"));
    for (const auto& station : json.at("stations")) out.stations.push_back({station.at("id"), station.at("outcome")});
    for (const auto& notice : json.at("notices")) out.notices.emplace_back(notice.at("place"), notice.at("text"));
    for (const auto& input : json.at("inputs")) {
      out.inputs.push_back({input.at("path"), input.at("xxh3_128"), input.at("bytes")});
    }
    out.key = pairs<std::string>(json.at("depends_on"));
    out.settings = pairs<std::string>(json.at("settings"));
    out.libraries = pairs<std::string>(json.at("libraries"));
    out.cautions = json.at("cautions").get<std::vector<std::string>>();
    return out;
  } catch (const Json::exception& error) {
    throw Error(Failure::data, path, std::string("is no ledger of windrow: ") + error.what());
  }
}

const std::vector<std::string>& cautions() {
  static const std::vector<std::string> kCautions = {
      "Adjusted model output is no design value.",
      "Values beyond the range of the calibration sample are extrapolations.",
      "A model run is one realisation: its days are not the days that were observed.",
      "For decisions defer to the national meteorological and hydrological service, to local codes and to licensed "
      "practice."};
  return kCautions;
}

}  // namespace windrow::report
