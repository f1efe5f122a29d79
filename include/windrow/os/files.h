// Files, whole or atomically replaced, and what the operating system tells about them.
#pragma once
#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

namespace windrow::os {

/// What identifies a state of a file without reading it.
struct FileState {
  std::int64_t size = 0, mtime_ns = 0;
  std::uint64_t inode = 0;
  bool operator==(const FileState&) const = default;
};
std::optional<FileState> state(const std::string& path);  ///< nothing when it does not exist
bool is_directory(const std::string& path);

/// Error(missing) when absent, Error(io) otherwise.
std::string read_text(const std::string& path);
std::vector<std::byte> read_bytes(const std::string& path);

/// A file read from front to back in pieces. Error(missing) when absent, Error(io) otherwise.
class ByteStream {
 public:
  explicit ByteStream(const std::string& path);
  ~ByteStream();
  ByteStream(const ByteStream&) = delete;
  ByteStream& operator=(const ByteStream&) = delete;
  std::size_t read(std::span<std::byte> out);  ///< bytes read; 0 at the end

 private:
  std::string path_;
  int file_;
};

/// Creates the folder and its parents. Error(output) with the reason.
void make_folder(const std::string& path);
/// Unique temporary name beside `path` (same folder): `.NAME.PID.N.part`.
std::string temporary_beside(const std::string& path);
/// Syncs `temporary`, renames it to `path`, syncs the folder. Error(output).
void publish(const std::string& temporary, const std::string& path);
/// write to a temporary, then publish. Error(output); nothing is left behind on failure.
void replace_file(const std::string& path, std::span<const std::byte> bytes);
void replace_file(const std::string& path, const std::string& text);
void remove_quietly(const std::string& path);
/// Removes temporaries `.NAME.PID.N.part` in a folder whose process is gone.
void sweep_temporaries(const std::string& folder);

/// Expands * ? [..] in the last path components; sorted by name; empty when nothing matches.
std::vector<std::string> glob(const std::string& pattern);
std::string absolute(const std::string& path, const std::string& base_folder);
std::string folder_of(const std::string& path);
std::string file_name_of(const std::string& path);

std::uint64_t free_bytes(const std::string& folder);  ///< for this user; quota respected where statvfs tells

}  // namespace windrow::os
