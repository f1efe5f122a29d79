// What a file's first bytes say, read without the library: which format it is, and how long it must be.
#pragma once
#include <string>

namespace windrow::cf {

/// Throws unless `path` can be opened as netCDF and is as long as its own header demands: Error(missing) when absent,
/// Error(data) when it is no NetCDF file or truncated, Error(io) when it cannot be read.
void check_readable(const std::string& path);

}  // namespace windrow::cf
