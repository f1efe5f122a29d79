// How one field of one run reaches the mesh: its map, with vectors and masked cells, and the readers that feed it.
// Private to the engine.
#pragma once
#include <memory>
#include <string>
#include <vector>

#include "session.h"
#include "windrow/units/units.h"

namespace windrow::engine {

/// Readers that stand on one another; the last is the one to use.
struct ReaderSet {
  std::vector<std::unique_ptr<pipeline::SourceReader>> held;
  [[nodiscard]] const pipeline::SourceReader* top() const { return held.empty() ? nullptr : held.back().get(); }
};

struct FieldRegridding {
  Regridding regridding;
  MapPtr map;  ///< the regridding's, or made from it: vectors, masked cells
  ReaderSet readers;
};

/// `affine`: source units to output units. Error(data) when method and meshes, or the two components of a vector, do
/// not go together.
FieldRegridding regrid_field(Session& session, std::size_t field, std::size_t run, const units::Affine& affine);

/// Readers of another run of the family on the same grid.
ReaderSet make_readers(Session& session, std::size_t field, std::size_t run, const Regridding& regridding);

/// Is the field one whose smooth interpolation must not fall below zero?
bool non_negative(const job::FieldSpec& field, const units::Affine& affine);

/// "field 'tas', run 'heron'".
std::string place_of(const Session& session, std::size_t field, std::size_t run);

}  // namespace windrow::engine
