#include "field_regridding.h"

#include <fmt/format.h>

#include "windrow/base/error.h"
#include "windrow/overlap/methods.h"

namespace windrow::engine {
namespace {

/// The map without the rows of cells outside the mask.
MapPtr masked(const linear_map::LinearMap& map, const std::vector<bool>& outside) {
  auto out = std::make_shared<linear_map::LinearMap>(map);
  std::size_t kept = 0;
  for (std::size_t row = 0; row < map.rows(); ++row) {
    const auto first = map.row_start[row], last = map.row_start[row + 1];
    out->row_start[row] = kept;
    for (auto k = first; k < last && !outside[row]; ++k, ++kept) {
      out->column[kept] = map.column[k];
      out->share[kept] = map.share[k];
      if (!map.cover.empty()) out->cover[kept] = map.cover[k];
      if (!map.factor.empty()) out->factor[kept] = map.factor[k];
    }
  }
  out->row_start[map.rows()] = kept;
  out->column.resize(kept);
  out->share.resize(kept);
  if (!map.cover.empty()) out->cover.resize(kept);
  if (!map.factor.empty()) out->factor.resize(kept);
  return out;
}

/// Do a variable's vectors run along the grid's own axes? CF standard names say so.
bool grid_relative(const std::string& standard_name) {
  return standard_name.starts_with("x_") || standard_name.starts_with("y_") || standard_name.starts_with("grid_") ||
         standard_name.find("_x_") != std::string::npos || standard_name.find("_y_") != std::string::npos;
}

/// Both components of a vector belong together; do they run along the grid's axes?
bool check_pair(Session& session, std::size_t field, std::size_t partner, std::size_t run) {
  const Source& source = session.source(field, run);
  const Source& other = session.source(partner, run);
  const std::string place = place_of(session, field, run);
  if (other.mesh->digest() != source.mesh->digest()) {
    throw Error(Failure::data, place,
                fmt::format("is on another grid than its partner '{}'; components of a vector "
                            "must share one (staggered ones are to be brought together first)",
                            session.job.fields[partner].variable));
  }
  const auto& own_info = source.variable->info();
  const auto& other_info = other.variable->info();
  if (own_info.units != other_info.units || other.variable->time().size() != source.variable->time().size()) {
    throw Error(Failure::data, place,
                fmt::format("has other units or times than its partner '{}'", session.job.fields[partner].variable));
  }
  const bool relative = grid_relative(own_info.standard_name);
  if (relative != grid_relative(other_info.standard_name)) {
    throw Error(Failure::data, place,
                fmt::format("runs along {}, but its partner '{}' along {}, as their standard names "
                            "say",
                            relative ? "the grid's axes" : "east and north", session.job.fields[partner].variable,
                            relative ? "east and north" : "the grid's axes"));
  }
  return relative;
}

}  // namespace

std::string place_of(const Session& session, std::size_t field, std::size_t run) {
  return fmt::format("field '{}', run '{}'", session.job.fields[field].name, session.job.runs[run].name);
}

/// Is the field one that cannot be negative in source units?
bool non_negative(const job::FieldSpec& field, const units::Affine& affine) {
  return field.method == job::Method::conservative_smooth && field.range && affine.scale > 0 &&
         (field.range->first - affine.offset) / affine.scale >= 0;
}

ReaderSet make_readers(Session& session, std::size_t field, std::size_t run, const Regridding& regridding) {
  ReaderSet out;
  const Source& source = session.source(field, run);
  const auto partner = session.partner_of(field);
  if (!partner) {
    out.held.push_back(std::make_unique<RunReader>(*source.variable));
    if (regridding.extension) out.held.push_back(std::make_unique<ExtendedReader>(*out.top(), *regridding.extension));
    return out;
  }
  const bool first = session.job.fields[field].pair == job::Pair::eastward;
  const Source& other = session.source(*partner, run);
  const bool relative = check_pair(session, field, *partner, run);
  out.held.push_back(std::make_unique<RunReader>(*(first ? source : other).variable));
  out.held.push_back(std::make_unique<RunReader>(*(first ? other : source).variable));
  out.held.push_back(std::make_unique<VectorReader>(
      *out.held[0], *out.held[1], relative ? overlap::grid_axes(*source.mesh) : overlap::true_axes(*source.mesh),
      regridding.extension.get()));
  return out;
}

FieldRegridding regrid_field(Session& session, std::size_t field, std::size_t run, const units::Affine& affine) {
  FieldRegridding out;
  const Source& source = session.source(field, run);
  const auto& spec = session.job.fields[field];
  const Target& target = session.target();
  if (spec.method == job::Method::conservative_smooth && !session.job.runs[run].land_fraction.empty()) {
    throw Error(Failure::job, place_of(session, field, run),
                "method conservative-smooth takes no land_fraction: integrals over parts of cells cannot be restored; "
                "expected conservative-1 or conservative-2");
  }
  const auto quantity = spec.total ? linear_map::Quantity::total : linear_map::Quantity::mean;
  out.regridding = session.maps().regrid(spec.method, *source.mesh, *target.mesh, quantity, non_negative(spec, affine));
  out.map = out.regridding.map;
  if (session.partner_of(field)) {
    const auto axes =
        spec.axes == job::VectorAxes::mesh ? overlap::grid_axes(*target.mesh) : overlap::true_axes(*target.mesh);
    out.map = std::make_shared<linear_map::LinearMap>(
        overlap::vector_map(*out.map, spec.pair == job::Pair::eastward ? axes.first : axes.second));
    out.regridding.keeps_integrals = false;
  }
  if (!target.outside.empty()) out.map = masked(*out.map, target.outside);
  out.readers = make_readers(session, field, run, out.regridding);
  return out;
}

}  // namespace windrow::engine
