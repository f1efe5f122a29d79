#include "stage_setup.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "adjust_setup.h"
#include "windrow/base/error.h"
#include "windrow/os/process.h"

namespace windrow::engine {
namespace {

// Beside what is resident when a stage starts: chunk caches of the libraries, the description of a product being
// assembled (below, per cell) and the heap's own slack.
constexpr std::int64_t kSlackBytes = 48 << 20;
constexpr std::int64_t kAssemblyBytesPerCell = 64;
// Mantissa bits for significant decimal digits: digits * log2(10), rounded up.
constexpr double kBitsPerDigit = 3.321928094887362;

bool same_edges(const std::vector<double>& a, const std::vector<double>& b) {
  constexpr double kSame_deg = 1e-5;  // float32 coordinates of the same grid differ by less
  return a.size() == b.size() &&
         std::equal(a.begin(), a.end(), b.begin(), [](double x, double y) { return std::fabs(x - y) <= kSame_deg; });
}

/// The same cells, as far as two files' rounding tells.
bool same_grid(const mesh::Mesh& a, const mesh::Mesh& b) {
  if (a.latlon() != nullptr && b.latlon() != nullptr && a.rotation() == nullptr && b.rotation() == nullptr) {
    return same_edges(a.latlon()->lon_deg, b.latlon()->lon_deg) && same_edges(a.latlon()->lat_deg, b.latlon()->lat_deg);
  }
  constexpr double kSame_m = 2;
  if (a.size() != b.size()) return false;
  for (std::size_t k = 0; k < a.size(); ++k) {
    if (!(reach::distance_m(a.centre(k), b.centre(k)) <= kSame_m)) return false;
  }
  return true;
}

std::vector<double> land_fraction(Session& session, std::size_t run, const Source& source, Notices& notices) {
  const std::string& path = session.job.runs[run].land_fraction;
  if (path.empty()) return {};
  const auto field = read_fixed(path, "land_area_fraction", "1", session.target().earth, notices,
                                hints_of(session.job.runs[run].grid));
  if (!same_grid(*field.mesh, *source.mesh)) {
    throw Error(Failure::data, path,
                fmt::format("is on another grid ({}) than run '{}' ({})", field.mesh->describe(),
                            session.job.runs[run].name, source.mesh->describe()));
  }
  return field.values;
}

/// Model height on the mesh: with the run's own weights where the grids are the same, so that cells with the same
/// pairings have the same height too.
std::vector<double> model_height_on_mesh(Session& session, std::size_t field, std::size_t run, const Source& source,
                                         const linear_map::Weights& weights, const linear_map::Extension* extension,
                                         Notices& notices) {
  const auto height = read_height(session.height_path(field, run), session.target().earth, notices,
                                  hints_of(session.job.runs[run].grid));
  if (!same_grid(*height.mesh, *source.mesh)) return onto_mesh(height, *session.target().mesh, session.maps());
  const linear_map::LinearMap& map = *weights.map;
  const auto columns = sorted_unique(map.column);
  std::vector<double> values(columns.size());
  if (extension == nullptr) {
    for (std::size_t i = 0; i < columns.size(); ++i) values[i] = height.values[columns[i]];
  } else {
    const auto extender = extension->extender(columns);
    std::vector<double> needed;
    for (const auto cell : extender->needs()) needed.push_back(height.values[cell]);
    extender->extend(needed, values);
  }
  linear_map::SourceBlock block;
  block.resize(columns, map.columns, 1);
  block.fill(0, 1, values.data());
  std::vector<double> out(map.rows());
  for (std::size_t row = 0; row < out.size(); ++row) {
    linear_map::apply_series(weights, row, block, std::span<double>(&out[row], 1));
  }
  return out;
}

/// The nearest source cells of every mesh cell, by the distance of centres.
pipeline::FillCandidates fill_candidates(const mesh::Mesh& source, const mesh::Mesh& target,
                                         const std::vector<std::uint32_t>& columns, const std::vector<bool>& outside) {
  constexpr std::size_t kPerRow = pipeline::FillCandidates::kPerRow;
  pipeline::FillCandidates out;
  out.column.assign(target.size() * kPerRow, linear_map::SourceBlock::kNotHeld);
  std::vector<GeoPoint> centres;
  centres.reserve(columns.size());
  for (const auto c : columns) centres.push_back(source.centre(c));
  std::vector<std::pair<double, std::uint32_t>> near(columns.size());
  for (std::size_t row = 0; row < target.size(); ++row) {
    if (!outside.empty() && outside[row]) continue;
    const GeoPoint centre = target.centre(row);
    for (std::size_t i = 0; i < columns.size(); ++i) near[i] = {reach::distance_m(centre, centres[i]), columns[i]};
    const std::size_t count = std::min(kPerRow, near.size());
    std::partial_sort(near.begin(), near.begin() + static_cast<std::ptrdiff_t>(count), near.end());
    for (std::size_t k = 0; k < count; ++k) out.column[row * kPerRow + k] = near[k].second;
  }
  return out;
}

std::vector<std::vector<std::uint32_t>> columns_by_block(const pipeline::StageInput& input) {
  const auto& map = *input.weights->map;
  const std::size_t across = (input.nx + input.chunk.x - 1) / input.chunk.x;
  const std::size_t down = (input.ny + input.chunk.y - 1) / input.chunk.y;
  std::vector<std::vector<std::uint32_t>> out(across * down);
  for (std::size_t y = 0; y < input.ny; ++y) {
    for (std::size_t x = 0; x < input.nx; ++x) {
      auto& block = out[y / input.chunk.y * across + x / input.chunk.x];
      const std::size_t row = y * input.nx + x;
      for (auto k = map.row_start[row]; k < map.row_start[row + 1]; ++k) {
        if (block.empty() || block.back() != map.column[k]) block.push_back(map.column[k]);
      }
      for (std::size_t k = 0; !input.fill.empty() && k < pipeline::FillCandidates::kPerRow; ++k) {
        const auto column = input.fill.column[row * pipeline::FillCandidates::kPerRow + k];
        if (column != linear_map::SourceBlock::kNotHeld) block.push_back(column);
      }
    }
  }
  for (auto& block : out) block = sorted_unique(std::move(block));
  return out;
}

pipeline::StepBins step_bins(const Scan& scan, const linear_map::LinearMap& map, const pipeline::FieldMath& math) {
  // A value is at most the sum of three columns' extremes: a vector's components, or a mean and its increment.
  double factor = 1;
  if (map.quantity == linear_map::Quantity::mean) {
    factor = 0;
    for (const double area : map.row_area) factor = std::max(factor, area);
  }
  const double columns = map.columns > map.value_columns ? 3 : 1;
  // Clamped values, taken back to source units, may be larger than any source value.
  double limit = 0;
  if (math.has_range) {
    limit =
        std::max(std::fabs((math.low - math.offset) / math.scale), std::fabs((math.high - math.offset) / math.scale));
  }
  pipeline::StepBins out;
  for (const double largest : scan.largest) {
    const auto bins = BinnedSum::bins(2 * factor * std::max(columns * largest, limit), map.rows() + 1);
    out.m1.push_back(bins.m1);
    out.m2.push_back(bins.m2);
  }
  return out;
}

pipeline::FieldMath field_math(const job::JobSpec& job, const job::FieldSpec& field, const units::Affine& affine) {
  pipeline::FieldMath out;
  out.scale = affine.scale;
  out.offset = affine.offset;
  out.min_cover = field.min_cover;
  out.min_land = field.min_land;
  if (field.range) {
    out.has_range = true;
    std::tie(out.low, out.high) = *field.range;
  }
  if (job.output.digits > 0) out.keep_bits = static_cast<int>(std::ceil(job.output.digits * kBitsPerDigit));
  return out;
}

void set_adjustment(Session& session, SharedFits& fits, std::size_t field, std::size_t run, const Source& source,
                    StageSetup& out, Notices& notices) {
  const std::size_t anchor = session.anchor_of(run);
  const auto& fit = fits.fit(session, field, anchor, notices);
  for (const auto& notice : fit.notices) notices.add(notice.place, notice.text);
  out.calibration = &fit.calibration;
  auto& adjust = out.adjust;
  adjust.setup = fit.calibration.setup;
  adjust.anchor_steps = fit.calibration.steps;
  adjust.run_is_anchor = anchor == run;
  if (!adjust.run_is_anchor) {
    out.anchor = &session.source(field, anchor);
    out.anchor_readers = make_readers(session, field, anchor, out.regridding);
    if (!same_grid(*out.anchor->mesh, *source.mesh)) {
      throw Error(Failure::data, place_of(session, field, run),
                  fmt::format("is on another grid than its anchor run '{}'", session.job.runs[anchor].name));
    }
    if (out.anchor->variable->frequency() != source.variable->frequency()) {
      throw Error(Failure::data, place_of(session, field, run),
                  fmt::format("has another time step than its anchor run '{}'", session.job.runs[anchor].name));
    }
  }
  adjust.run_steps =
      adjust.run_is_anchor
          ? adjust.anchor_steps
          : adjust::make_steps(adjust.setup, source.variable->calendar(), step_dates(*source.variable),
                               session.job.fields[field].adjust.period, false, place_of(session, field, run));
  const Carried& carried = fit.calibration.carried;
  hand_over(carried, carried.drift.used ? fits.cell_height(session) : std::vector<double>(), adjust);
  if (adjust.setup.wet_days() && adjust.setup.wet_day > 0) {
    adjust.anchor_draws = std::make_shared<adjust::Draws>(kDrawSeed, adjust.anchor_steps.date);
    adjust.run_draws =
        adjust.run_is_anchor ? adjust.anchor_draws : std::make_shared<adjust::Draws>(kDrawSeed, adjust.run_steps.date);
    const auto& mesh = *session.target().mesh;
    for (std::size_t i = 0; i < mesh.size(); ++i) adjust.cell_centre.push_back(mesh.centre(i));
  }
  adjust.missing_beyond = session.job.reach.beyond == job::Beyond::missing;
  adjust.terrain = session.job.fields[field].terrain.has_value();
  if (!adjust.terrain) return;
  adjust.lapse = fit.calibration.lapse;
  adjust.cell_height = fits.cell_height(session);
  adjust.model_height =
      model_height_on_mesh(session, field, run, source, out.weights, out.regridding.extension.get(), notices);
  if (!adjust.run_is_anchor) {
    adjust.anchor_model_height =
        model_height_on_mesh(session, field, anchor, source, out.weights, out.regridding.extension.get(), notices);
  }
}

std::vector<std::uint32_t> value_columns(const std::vector<std::uint32_t>& columns, const linear_map::LinearMap& map) {
  return {columns.begin(), std::lower_bound(columns.begin(), columns.end(), map.value_columns)};
}

/// Conservative methods balance with their own map; sampled fields are compared with what overlaps the mesh. Vectors
/// and points have no integral.
void scan(Session& session, StageSetup& out, std::vector<std::uint32_t> columns) {
  const auto& context = *out.context;
  std::vector<double> weight(out.map->columns, 0.0);
  const bool scalar = !session.partner_of(context.field);
  if (scalar && out.regridding.keeps_integrals) {
    weight = column_weights(*out.map, out.fraction);
  } else if (scalar && context.target.mesh->has_area() && context.source.mesh->has_area()) {
    const auto overlap =
        session.maps().conservative(*context.source.mesh, *context.target.mesh, linear_map::Quantity::mean);
    weight = column_weights(*overlap, {});
    columns.insert(columns.end(), overlap->column.begin(), overlap->column.end());
    columns = sorted_unique(std::move(columns));
  }
  out.scan = scan_source(*out.run_readers.top(), columns, weight, context.source.variable->time().size());
}

/// What a worker holds of one row's distributions: tables, own windows' samples or nodes, a number or two a step.
std::size_t adjustment_bytes(const pipeline::AdjustInput& adjust) {
  const auto quantiles = static_cast<std::size_t>(adjust.setup.quantiles);
  const std::size_t groups = adjust.run_steps.window_years.size() * adjust.seasons();
  std::size_t numbers = adjust.seasons() * quantiles * 6 + groups * quantiles;
  if (adjust.setup.wet_days()) {
    numbers += adjust.anchor_steps.sample.step.size() + adjust.run_steps.window_sample.step.size() +
               2 * adjust.run_steps.date.size();
  }
  return 8 * numbers;
}

void plan_stage(Session& session, StageSetup& out, const std::string& place) {
  auto& context = *out.context;
  const auto& input = context.input;
  plan::StageNeeds needs;
  needs.ny = input.ny;
  needs.nx = input.nx;
  needs.steps = out.scan.largest.size();
  needs.chunk = input.chunk;
  if (out.calibration != nullptr) {
    needs.anchor_steps = out.adjust.anchor_steps.month.size();
    needs.run_is_anchor = out.adjust.run_is_anchor;
    needs.table_bytes = adjustment_bytes(out.adjust);
  }
  for (const auto& product : input.products) {
    needs.products.push_back(product.span);
    needs.cover_varies = needs.cover_varies || (product.span.wanted && product.cover_varies);
  }
  needs.block_columns = columns_by_block(input);
  needs.memory = memory_ceiling(session.job);
  needs.resident =
      os::current_memory() + kSlackBytes + static_cast<std::int64_t>(input.ny * input.nx) * kAssemblyBytesPerCell;
  needs.threads = thread_count(session);
  out.stage = plan::make_stage(needs, place);
}

}  // namespace

plan::Chunk chunk_of(const Session& session, const Target& target, cf::Frequency frequency, bool adjusted) {
  if (const auto& tile = session.job.output.tile) {
    return {static_cast<std::size_t>((*tile)[0]), std::min(static_cast<std::size_t>((*tile)[1]), target.ny),
            std::min(static_cast<std::size_t>((*tile)[2]), target.nx)};
  }
  return plan::automatic_chunk({target.ny, target.nx, adjusted, frequency == cf::Frequency::monthly,
                                frequency == cf::Frequency::fixed});
}

std::int64_t memory_ceiling(const job::JobSpec& job) {
  return job.memory_bytes ? *job.memory_bytes : os::memory_limit() / 10 * 8;
}

int thread_count(const Session& session) {
  const int asked = session.options.threads > 0 ? session.options.threads : session.job.threads;
  return asked > 0 ? asked : os::usable_cpus();
}

std::string output_units(Session& session, std::size_t field, std::size_t run) {
  const auto& asked = session.job.fields[field].units;
  return asked.empty() ? units::repaired(session.variable(field, run).info().units, nullptr) : asked;
}

const SharedFits::Fit& SharedFits::fit(Session& session, std::size_t field, std::size_t anchor, Notices& told) {
  if (const auto found = fits_.find({field, anchor}); found != fits_.end()) return found->second;
  Notices notices;
  const Source& source = session.source(field, anchor);
  const auto& info = source.variable->info();
  const std::string units = output_units(session, field, anchor);
  const auto conversion = units::conversion(info.units, units, info.standard_name, place_of(session, field, anchor));
  std::optional<FixedField> height;
  if (session.job.fields[field].terrain) {
    height = read_height(session.height_path(field, anchor), session.target().earth, notices,
                         hints_of(session.job.runs[anchor].grid));
  }
  Fit made;
  try {
    made.calibration = calibrate({session.job, session.job.fields[field], session.target(), source,
                                  session.job.runs[anchor].name, conversion, units, height ? &*height : nullptr},
                                 notices);
  } catch (const Error&) {
    for (const auto& notice : notices.list()) told.add(notice.place, notice.text);
    throw;
  }
  made.notices = session.notices(field, anchor);
  for (const auto& notice : notices.list()) made.notices.push_back(notice);
  return fits_[{field, anchor}] = std::move(made);
}

const std::vector<double>& SharedFits::cell_height(Session& session) {
  if (!height_ && !session.target().mesh->has_area()) height_ = session.target().elevation;  // towns
  if (!height_) {
    Notices notices;
    const auto field = read_height(session.job.mesh.height, session.target().earth, notices);
    height_ = onto_mesh(field, *session.target().mesh, session.maps());
  }
  return *height_;
}

std::unique_ptr<StageSetup> set_up(Session& session, SharedFits& fits, std::size_t field, std::size_t run,
                                   std::vector<Product> products, Notices& notices) {
  const std::string place = place_of(session, field, run);
  const auto& spec = session.job.fields[field];
  auto out = std::make_unique<StageSetup>();
  const Source& source = session.source(field, run);
  const Target& target = session.target();
  const std::string units = output_units(session, field, run);
  const auto& info = source.variable->info();
  const auto conversion = units::conversion(info.units, units, info.standard_name, place);
  auto regridded = regrid_field(session, field, run, conversion.affine);
  out->regridding = std::move(regridded.regridding);
  out->map = std::move(regridded.map);
  out->run_readers = std::move(regridded.readers);
  if (out->map->pairings() == 0) {
    throw Error(Failure::data, place,
                fmt::format("the mesh lies outside the model grid ({})", source.mesh->describe()));
  }
  out->fraction = land_fraction(session, run, source, notices);
  out->weights = linear_map::make_weights(*out->map, out->fraction);
  out->weights.categories = out->regridding.categories;
  if (non_negative(spec, conversion.affine)) out->weights.not_below = 0;
  out->context = std::make_unique<StageContext>(StageContext{session,
                                                             field,
                                                             run,
                                                             source,
                                                             target,
                                                             out->weights,
                                                             out->regridding,
                                                             out->scan,
                                                             nullptr,
                                                             {},
                                                             conversion,
                                                             units,
                                                             std::move(products),
                                                             {}});
  auto& context = *out->context;
  auto& input = context.input;
  if (session.adjusted(field)) {
    set_adjustment(session, fits, field, run, source, *out, notices);
    context.calibration = out->calibration;
    input.adjust = &out->adjust;
  }
  const auto columns = sorted_unique(out->map->column);
  if (spec.fill_nearest) {
    input.fill = fill_candidates(*source.mesh, *target.mesh, value_columns(columns, *out->map), target.outside);
  }
  scan(session, *out, columns);
  input.weights = &out->weights;
  input.ny = target.ny;
  input.nx = target.nx;
  input.chunk = chunk_of(session, target, source.variable->frequency(), session.adjusted(field));
  input.field = field_math(session.job, spec, conversion.affine);
  input.level = session.job.output.deflate ? session.job.output.level : 0;
  input.bins = step_bins(out->scan, *out->map, input.field);
  for (const auto& product : context.products) {
    input.products.push_back(
        {product.key_digest, product.span, out->scan.mask_varies(product.span.t0, product.span.t1)});
  }
  context.notices = session.notices(field, run);
  for (const auto& notice : notices.list()) context.notices.push_back(notice);
  context.notices.insert(context.notices.end(), target.notices.begin(), target.notices.end());
  plan_stage(session, *out, place);
  return out;
}

}  // namespace windrow::engine
