// The conservation balance of a product: source integral = product + below min_cover, measured on the double results.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "assemble.h"

namespace windrow::engine {
namespace {

void add_step(report::BalanceLine& line, double source, double absolute, const pipeline::TileStats& stats,
              std::size_t t) {
  const double product = stats.integral(pipeline::kKept, t), below = stats.integral(pipeline::kBelow, t);
  line.source += source;
  line.product += product;
  line.below += below;
  line.filled += stats.integral(pipeline::kFilledIntegral, t);
  if (absolute > 0) line.relative = std::max(line.relative, std::fabs(source - product - below) / absolute);
}

}  // namespace

report::Balance balance_of(const StageContext& context, const Product& product, const pipeline::TileStats& stats) {
  report::Balance out;
  const bool total = context.weights.map->quantity == linear_map::Quantity::total;
  out.kept = context.regridding.keeps_integrals;
  if (!out.kept) {
    const bool vector = context.session.partner_of(context.field).has_value();
    out.statement = vector || !context.target.mesh->has_area()
                        ? "components of vectors and values at points have no integral to be kept"
                        : fmt::format(
                              "method {} keeps no integrals: source is the integral of what overlaps the mesh, "
                              "product that of the product's cells (source units times steradians)",
                              name_of(context.session.job.fields[context.field].method));
  } else
    out.statement = fmt::format(
        "{} of the regridded field, in double precision, before height, adjustment and rounding; source cells wholly "
        "inside the mesh count with their own area; source = product + below_min_cover; relative to the integral of "
        "absolute values of the step",
        total ? "sums over the mesh" : "integrals over the mesh (source units times steradians)");
  out.all.period = "all";
  out.stored = context.calibration == nullptr;
  const auto dates = step_dates(*context.source.variable);
  for (std::size_t t = product.span.t0; t < product.span.t1; ++t) {
    const std::size_t at = t - product.span.t0;
    const double source = context.scan.integral[t], absolute = context.scan.absolute[t];
    const std::string month = fmt::format("{:04d}-{:02d}", dates[t].year, dates[t].month);
    if (out.months.empty() || out.months.back().period != month) {
      out.months.emplace_back();
      out.months.back().period = month;
    }
    add_step(out.months.back(), source, absolute, stats, at);
    add_step(out.all, source, absolute, stats, at);
    if (out.stored && absolute > 0) {
      const double stored = stats.integral(pipeline::kStored, at), kept = stats.integral(pipeline::kKept, at);
      out.stored_relative = std::max(out.stored_relative, std::fabs(stored - kept) / absolute);
    }
  }
  return out;
}

}  // namespace windrow::engine
