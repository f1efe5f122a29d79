// Coarse values for the pipeline: a run's variable, what is computed from it before a map is applied, and vectors.
// Private to the engine.
#pragma once
#include <memory>
#include <vector>

#include "windrow/cf/dataset.h"
#include "windrow/linear_map/extension.h"
#include "windrow/overlap/methods.h"
#include "windrow/pipeline/stage.h"

namespace windrow::engine {

/// Ascending, each once: how readers are asked for columns.
std::vector<std::uint32_t> sorted_unique(std::vector<std::uint32_t> values);

/// Reads a run's variable.
class RunReader : public pipeline::SourceReader {
 public:
  explicit RunReader(const cf::RunVariable& variable) : variable_(variable) {}
  void read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const override;

 private:
  const cf::RunVariable& variable_;
};

/// Columns of a map with increments, from the cells' values of another reader.
class ExtendedReader : public pipeline::SourceReader {
 public:
  ExtendedReader(const pipeline::SourceReader& values, const linear_map::Extension& extension)
      : values_(values), extension_(extension) {}
  void read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const override;

 private:
  const pipeline::SourceReader& values_;
  const linear_map::Extension& extension_;
};

/// Cartesian components of tangent vectors given by two variables, as overlap::vector_map numbers its columns. A cell
/// where either component is missing is missing. `scalar`: extension of the scalar map, or null.
class VectorReader : public pipeline::SourceReader {
 public:
  VectorReader(const pipeline::SourceReader& first, const pipeline::SourceReader& second, overlap::Axes axes,
               const linear_map::Extension* scalar)
      : first_(first), second_(second), axes_(std::move(axes)), scalar_(scalar) {}
  void read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const override;

 private:
  const pipeline::SourceReader& first_;
  const pipeline::SourceReader& second_;
  overlap::Axes axes_;
  const linear_map::Extension* scalar_;
};

}  // namespace windrow::engine
