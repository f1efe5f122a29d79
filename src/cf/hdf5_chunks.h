// The HDF5 half of writing a product: finished chunks put in place by direct chunk write.
#pragma once
#include <cstddef>
#include <span>
#include <string>
#include <vector>

namespace windrow::cf {

/// A defined, closed netCDF-4 file opened for its chunks. Every method takes library_mutex() itself. Failures are
/// Error(output) with the system's reason. The destructor closes quietly: who writes calls close().
class ChunkFile {
 public:
  explicit ChunkFile(const std::string& path);
  ~ChunkFile();
  ChunkFile(const ChunkFile&) = delete;
  ChunkFile& operator=(const ChunkFile&) = delete;

  /// Opens a variable, extends it to `lengths` (an unlimited dimension has no extent yet, and a chunk written beyond
  /// the extent crashes the library) and checks that its filters are shuffle, deflate (`deflated`) or none.
  void begin(const std::string& variable, std::span<const std::size_t> lengths, bool deflated);
  /// `offset` in elements, a multiple of the chunk; `bytes` as they go to disk, edge chunks at full size.
  void write(std::span<const std::size_t> offset, std::span<const std::byte> bytes);
  void end();    ///< of the variable
  void close();  ///< of the file

 private:
  [[noreturn]] void fail() const;
  void check_filters(bool deflated) const;
  std::string path_;
  std::int64_t file_ = -1, dataset_ = -1;  ///< HDF5 identifiers (hid_t)
};

}  // namespace windrow::cf
