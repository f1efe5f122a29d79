// Writing products: plain records describe a CF file; chunks come compressed and are put in place unopened.
#pragma once
#include <cstddef>
#include <cstdint>
#include <functional>
#include <optional>
#include <span>
#include <string>
#include <variant>
#include <vector>

#include "windrow/cf/dataset.h"

namespace windrow::cf {

using AttributeValue = std::variant<std::string, double, float, std::int32_t, std::int64_t, std::int8_t,
                                    std::vector<double>, std::vector<std::int8_t>>;
struct NamedValue {
  std::string name;
  AttributeValue value;
};

struct Dimension {
  std::string name;
  std::size_t length = 0;
  bool unlimited = false;
};

enum class Type { text, int8, int32, float32, float64 };  ///< text: character codes, UTF-8, padded with zeros

/// A variable whose values are given whole (coordinates, bounds, masks). values.size() is the product of the lengths;
/// int and char types are converted from double exactly.
struct SmallVariable {
  std::string name;
  Type type = Type::float64;
  std::vector<std::string> dimensions;  ///< empty: scalar
  std::vector<NamedValue> attributes;
  std::vector<double> values;
  bool deflate = false;  ///< large ones: shuffle + deflate level 1, packed here (the library's is slow)
};

/// A variable whose chunks are written directly. Float32, shuffle + deflate (level > 0) or raw (level 0), no fill.
struct ChunkedVariable {
  std::string name;
  std::vector<std::string> dimensions;  ///< first is time
  std::vector<std::size_t> chunk;       ///< one a dimension
  int level = 1;
  float fill_value = 9.96920997e36F;  ///< written as _FillValue
  std::vector<NamedValue> attributes;
};

struct ProductFile {
  std::vector<Dimension> dimensions;
  std::vector<SmallVariable> small;
  std::vector<ChunkedVariable> chunked;
  std::vector<NamedValue> global;
};

/// Bytes of chunk `index` (row-major over the chunk grid) of chunked variable `variable`, as they go to disk: edge
/// chunks padded to full size, little-endian, shuffled, then deflated (level 0: plain). Called in ascending order.
using ChunkSource = std::function<std::span<const std::byte>(std::size_t variable, std::size_t index)>;

/// Writes the whole file at `path` (a temporary name of the caller's): defines with netCDF, closes, fills chunks in
/// ascending order with HDF5's direct chunk write, closes, checks every close. Does not sync or rename.
/// Error(output) with errno's text on a full disk or missing permission; the partial file is removed.
void write_product(const std::string& path, const ProductFile& product, const ChunkSource& chunks);

/// Number of chunks along each dimension of a chunked variable.
std::vector<std::size_t> chunk_grid(const ProductFile& product, std::size_t variable);

/// Reads one product back for `vouch`: attributes, and values of a variable step by step.
struct ProductReader {
  virtual ~ProductReader() = default;
  [[nodiscard]] virtual std::vector<Attribute> global_attributes() const = 0;
  [[nodiscard]] virtual std::vector<std::string> variables() const = 0;
  [[nodiscard]] virtual std::vector<Attribute> attributes(const std::string& variable) const = 0;
  [[nodiscard]] virtual std::vector<Dimension> dimensions(const std::string& variable) const = 0;
  /// Raw values (no unpacking, fill as stored) of hyperslab; converted to double.
  [[nodiscard]] virtual std::vector<double> values(const std::string& variable) const = 0;
  virtual void read_steps(const std::string& variable, std::size_t t0, std::size_t t1,
                          std::vector<float>& out) const = 0;
  /// A hyperslab: `start` and `count` have one entry a dimension.
  virtual void read_window(const std::string& variable, const std::vector<std::size_t>& start,
                           const std::vector<std::size_t>& count, std::vector<float>& out) const = 0;
};
std::unique_ptr<ProductReader> open_product(const std::string& path);

}  // namespace windrow::cf
