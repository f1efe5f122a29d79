#include "assemble.h"

#include <fmt/format.h>

#include <algorithm>
#include <cstdlib>
#include <ctime>

#include "table.h"
#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/os/files.h"

namespace windrow::engine {
namespace {

std::int64_t file_size(const std::string& path) {
  const auto state = os::state(path);
  return state ? state->size : 0;
}

std::vector<std::pair<std::string, double>> cover_figures(const StageContext& context, const Product& product) {
  const auto cover = cover_under(context.weights, context.scan, context.scan.mask_of_step[product.span.t0]);
  ExactSum sum;
  double least = 1;
  std::size_t none = 0, full = 0;
  for (const float x : cover) {
    sum.add(x);
    least = std::min(least, static_cast<double>(x));
    none += x == 0 ? 1 : 0;
    full += x >= 1 - 1e-6 ? 1 : 0;
  }
  const bool varies = context.scan.mask_varies(product.span.t0, product.span.t1);
  return {{"mean_at_first_step", sum.value() / static_cast<double>(cover.size())},
          {"least_at_first_step", least},
          {"cells_without_source", static_cast<double>(none)},
          {"cells_fully_covered", static_cast<double>(full)},
          {"varies_in_time", varies ? 1.0 : 0.0}};
}

std::vector<std::pair<std::string, std::int64_t>> count_figures(const StageContext& context, const Product& product,
                                                                const pipeline::TileStats& stats) {
  static const std::array<const char*, pipeline::kCounts> kNames = {"missing",
                                                                    "filled",
                                                                    "below_min_cover_or_land",
                                                                    "clamped_low",
                                                                    "clamped_high",
                                                                    "below_calibrated_range",
                                                                    "above_calibrated_range",
                                                                    "nodes_reordered",
                                                                    "ratios_capped"};
  const auto values = static_cast<std::int64_t>(context.target.mesh->size() * (product.span.t1 - product.span.t0));
  std::vector<std::pair<std::string, std::int64_t>> out{{"values", values}};
  for (std::size_t i = 0; i < pipeline::kCounts; ++i) {
    out.emplace_back(kNames[i], static_cast<std::int64_t>(stats.count[i]));
  }
  if (context.calibration != nullptr) {
    out.emplace_back("stations_level", static_cast<std::int64_t>(context.calibration->carried.level_stations));
    out.emplace_back("stations_shape", static_cast<std::int64_t>(context.calibration->carried.shape_stations));
    const auto left = static_cast<std::int64_t>(context.calibration->stations.size()) -
                      static_cast<std::int64_t>(context.calibration->carried.level_stations);
    out.emplace_back("stations_left_out", left);
  }
  return out;
}

report::Ledger ledger_of(const StageContext& context, const Product& product, const pipeline::TileStats& stats,
                         const report::Balance& balance) {
  const auto& job = context.session.job;
  const auto& run = job.runs[context.run];
  report::Ledger out;
  out.version = WINDROW_VERSION;
  out.product = os::file_name_of(product.path);
  out.field = job.fields[context.field].name;
  out.run = run.name;
  out.family = run.family;
  out.forcing = run.forcing;
  out.mesh = job.mesh.name;
  out.product_version = job.version;
  for (const auto& [name, digest] : product.key.parts) out.key.emplace_back(name, digest.hex());
  out.settings = job::product_settings(job, context.field, context.run, job::Effect::encoding);
  out.libraries = {
      {"netcdf", cf::library_version()}, {"proj_gdal", geo::library_version()}, {"codec", codec::library_version()}};
  for (const auto& path : product.inputs) {
    const std::string told = told_path(path, context.session.folder());
    for (const auto& [name, digest] : product.key.parts) {
      if (name == told) out.inputs.push_back({told, digest.hex(), file_size(path)});
    }
  }
  out.linear_map = context.weights.map->provenance;
  out.balance = balance;
  out.cover = cover_figures(context, product);
  out.counts = count_figures(context, product, stats);
  if (context.calibration != nullptr) out.stations = context.calibration->stations;
  for (const auto& notice : context.notices) {
    out.notices.emplace_back(told_path(notice.place, context.session.folder()), notice.text);
  }
  std::sort(out.notices.begin(), out.notices.end());
  if (stats.minimum <= stats.maximum) {
    out.minimum = stats.minimum;
    out.maximum = stats.maximum;
  }
  out.cautions = report::cautions();
  return out;
}

}  // namespace

std::string newest_input_date(const Product& product) {
  std::time_t newest = 0;
  if (const char* fixed = std::getenv("SOURCE_DATE_EPOCH"); fixed != nullptr) {
    newest = static_cast<std::time_t>(std::strtoll(fixed, nullptr, 10));
  } else {
    for (const auto& path : product.origins.empty() ? product.inputs : product.origins) {
      if (const auto state = os::state(path)) {
        newest = std::max(newest, static_cast<std::time_t>(state->mtime_ns / 1'000'000'000));
      }
    }
  }
  std::tm parts{};
  ::gmtime_r(&newest, &parts);
  char text[32];
  std::strftime(text, sizeof text, "%Y-%m-%dT%H:%M:%SZ", &parts);
  return text;
}

std::string write_temporary(const Product& product, const cf::ProductFile& file, const cf::ChunkSource& chunks,
                            report::Ledger& ledger) {
  os::make_folder(os::folder_of(product.path));
  std::string temporary = os::temporary_beside(product.path);
  try {
    cf::write_product(temporary, file, chunks);
  } catch (const Error& error) {
    // Users know the product's name, not that of its temporary.
    std::string what = error.what();
    if (what.starts_with(temporary)) what.replace(0, temporary.size(), product.path);
    throw Error(error.kind(), "", what);
  }
  ledger.product_bytes = file_size(temporary);
  ledger.product_digest = digest_file(temporary).hex();
  return temporary;
}

void assemble(const StageContext& context, std::size_t index, const pipeline::Spool& spool) {
  const Product& product = context.products[index];
  const auto stats = pipeline::merge_stats(context.input, index, spool);
  const auto balance = balance_of(context, product, stats);
  const auto file = describe(context, product, stats, balance);
  auto ledger = ledger_of(context, product, stats, balance);
  std::vector<std::byte> chunk;
  const auto chunks = [&](std::size_t variable, std::size_t at) -> std::span<const std::byte> {
    spool.payload({context.input.products[index].key, static_cast<std::uint32_t>(variable),
                   static_cast<std::uint32_t>(at)}, chunk);
    return chunk;
  };
  const std::string temporary = write_temporary(product, file, chunks, ledger);
  // The inputs are looked at again before the product gets its name.
  for (const auto& path : product.inputs) {
    for (const auto& [name, digest] : product.key.parts) {
      if (name != told_path(path, context.session.folder())) continue;
      if (context.session.digests().of(path) == digest) continue;
      os::remove_quietly(temporary);
      throw Error(Failure::io, path, "changed while the job was running; run again");
    }
  }
  os::publish(temporary, product.path);
  if (context.session.job.output.csv) {
    const auto& variable = *context.source.variable;
    const Series axis{"", {}, variable.time(), step_dates(variable), variable.calendar(), variable.frequency()};
    write_table(product, axis, context.session.job.fields[context.field].name, context.output_units, context.target.ids,
                context.input.field.missing);
  }
  os::replace_file(product.ledger_path, report::to_json(ledger));
}

}  // namespace windrow::engine
