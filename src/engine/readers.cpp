#include "readers.h"

#include <algorithm>
#include <cmath>
#include <span>

#include "windrow/base/error.h"
#include "windrow/os/process.h"

namespace windrow::engine {
namespace {

std::size_t position(const std::vector<std::uint32_t>& sorted, std::uint32_t value) {
  return static_cast<std::size_t>(std::lower_bound(sorted.begin(), sorted.end(), value) - sorted.begin());
}

/// One component of a vector as a field of its own.
class Component final : public pipeline::SourceReader {
 public:
  Component(const pipeline::SourceReader& first, const pipeline::SourceReader& second, const overlap::Axes& axes,
            double sphere::Vec3::*part)
      : first_(first), second_(second), axes_(axes), part_(part) {}
  void read(const std::vector<std::uint32_t>& cells, std::size_t t0, std::size_t t1, double* out) const override {
    std::vector<double> other((t1 - t0) * cells.size());
    first_.read(cells, t0, t1, out);
    second_.read(cells, t0, t1, other.data());
    for (std::size_t k = 0; k < other.size(); ++k) {
      const std::uint32_t cell = cells[k % cells.size()];
      out[k] = out[k] * axes_.first[cell].*part_ + other[k] * axes_.second[cell].*part_;  // NaN where either is
    }
  }

 private:
  const pipeline::SourceReader& first_;
  const pipeline::SourceReader& second_;
  const overlap::Axes& axes_;
  double sphere::Vec3::*part_;
};

}  // namespace

std::vector<std::uint32_t> sorted_unique(std::vector<std::uint32_t> values) {
  std::sort(values.begin(), values.end());
  values.erase(std::unique(values.begin(), values.end()), values.end());
  return values;
}

void RunReader::read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const {
  // A first pass over a long run takes longer than a user waits who asked to stop.
  if (os::stop_requested()) throw Error(Failure::interrupted, "", "interrupted; run again to go on from here");
  variable_.read(t0, t1, columns, out);
}

void ExtendedReader::read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1,
                          double* out) const {
  const auto extender = extension_.extender(columns);
  const auto& cells = extender->needs();
  std::vector<double> values((t1 - t0) * cells.size());
  values_.read(cells, t0, t1, values.data());
  for (std::size_t t = 0; t < t1 - t0; ++t) {
    extender->extend({values.data() + t * cells.size(), cells.size()}, {out + t * columns.size(), columns.size()});
  }
}

void VectorReader::read(const std::vector<std::uint32_t>& columns, std::size_t t0, std::size_t t1, double* out) const {
  // Column c stands for component `part` of column `plain` of the scalar map.
  const auto cells = static_cast<std::uint32_t>(axes_.first.size());
  const auto increments = static_cast<std::uint32_t>(scalar_ == nullptr ? 0 : scalar_->columns() - cells);
  const auto split = [&](std::uint32_t c) {
    if (c < 3 * cells || increments == 0) return std::pair(c / cells, c % cells);
    return std::pair((c - 3 * cells) / increments, cells + (c - 3 * cells) % increments);
  };
  constexpr double sphere::Vec3::*kParts[3] = {&sphere::Vec3::x, &sphere::Vec3::y, &sphere::Vec3::z};
  for (std::uint32_t part = 0; part < 3; ++part) {
    std::vector<std::uint32_t> plain;
    for (const std::uint32_t c : columns) {
      if (split(c).first == part) plain.push_back(split(c).second);
    }
    plain = sorted_unique(std::move(plain));
    if (plain.empty()) continue;
    std::vector<double> values((t1 - t0) * plain.size());
    const Component component(first_, second_, axes_, kParts[part]);
    if (scalar_ == nullptr) {
      component.read(plain, t0, t1, values.data());
    } else {
      ExtendedReader(component, *scalar_).read(plain, t0, t1, values.data());
    }
    for (std::size_t i = 0; i < columns.size(); ++i) {
      const auto [own, column] = split(columns[i]);
      if (own != part) continue;
      const std::size_t at = position(plain, column);
      for (std::size_t t = 0; t < t1 - t0; ++t) {
        const double x = values[t * plain.size() + at];
        // Only the first component's values carry weight; the others add nothing where the vector is missing.
        out[t * columns.size() + i] = part > 0 && std::isnan(x) ? 0 : x;
      }
    }
  }
}

}  // namespace windrow::engine
