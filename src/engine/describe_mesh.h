// The CF description of a product's mesh: dimensions, coordinates, bounds, geometry, grid mapping. Private to the
// engine.
#pragma once
#include <string>
#include <vector>

#include "target.h"
#include "windrow/cf/product.h"

namespace windrow::engine {

struct MeshDescription {
  std::vector<cf::Dimension> dimensions;  ///< all that the variables below use
  std::vector<std::string> horizontal;    ///< of the data: two of a structured mesh, otherwise one
  std::vector<cf::SmallVariable> variables;
  std::vector<cf::NamedValue> data_attributes;  ///< grid_mapping, coordinates, cell_measures, mesh, geometry
  std::vector<cf::NamedValue> global;           ///< featureType
  std::string conventions = "CF-1.13";
};

/// CF Conventions 1.13: 5.6 and appendix F (grid mappings), 5.9 (UGRID), 7.5 (geometries), 9 (towns).
MeshDescription describe_mesh(const Target& target);

}  // namespace windrow::engine
