// The netCDF half of writing a product: dimensions, variables, attributes and values given whole.
#pragma once
#include <string>

#include "windrow/cf/product.h"

namespace windrow::cf {

/// Creates `path` and closes it. Deflated small variables and chunked variables are defined, not filled.
void define_product(const std::string& path, const ProductFile& product);

/// What kept the output from being written, for people: the system's reason where it gave one (`error_number` is errno
/// after the failed call), else the library's.
std::string output_reason(int error_number, const std::string& library_text);

}  // namespace windrow::cf
