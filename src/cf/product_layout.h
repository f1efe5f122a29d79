// Lengths, chunk shapes and bytes of a product's variables, before any file exists. No library call here.
#pragma once
#include <cstddef>
#include <span>
#include <string>
#include <vector>

#include "windrow/cf/product.h"

namespace windrow::cf {

/// Throws Error(defect) when records contradict each other: unknown dimensions, counts that do not fit, empty chunks.
void check_layout(const ProductFile& product);

std::vector<std::size_t> lengths(const ProductFile& product, const std::vector<std::string>& dimensions);
bool has_unlimited(const ProductFile& product, const std::vector<std::string>& dimensions);
std::size_t bytes_of(Type type);

/// Chunks of a small variable: whole, except that unlimited dimensions take kUnlimitedChunk and deflated variables are
/// cut along their first dimension into pieces of about kSmallChunkBytes. Empty: stored contiguously.
std::vector<std::size_t> small_chunk(const ProductFile& product, const SmallVariable& variable);

/// Never the current length: appended months must not change how a file is laid out.
inline constexpr std::size_t kUnlimitedChunk = 512;
inline constexpr std::size_t kSmallChunkBytes = std::size_t{1} << 20;

/// Values in the file's own type and byte order. Error(defect) when an integer type cannot hold one exactly.
void encode(const SmallVariable& variable, std::span<const double> values, std::span<std::byte> out);

/// Chunks along each dimension; and the first element of chunk `index` (row-major).
std::vector<std::size_t> grid_of(std::span<const std::size_t> lengths, std::span<const std::size_t> chunk);
std::size_t product_of(std::span<const std::size_t> lengths);
std::vector<std::size_t> offset_of(std::size_t index, std::span<const std::size_t> grid,
                                   std::span<const std::size_t> chunk);

}  // namespace windrow::cf
