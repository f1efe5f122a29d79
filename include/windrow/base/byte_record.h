// Plain values as they stand in memory, one after another: the workspace's own files. Little-endian machines only, which the
// writer of products insists on.
#pragma once
#include <cstddef>
#include <cstdint>
#include <cstring>
#include <span>
#include <vector>

namespace windrow {

/// Appends `count` values to `out`.
template <typename T>
void put_values(std::vector<std::byte>& out, const T* data, std::size_t count) {
  const std::size_t at = out.size();
  out.resize(at + count * sizeof(T));
  if (count > 0) std::memcpy(out.data() + at, data, count * sizeof(T));
}

/// Reads from the front; every read checks what is left, so a damaged length ends in false and never in a wild read.
class RecordReader {
 public:
  explicit RecordReader(std::span<const std::byte> bytes) : rest_(bytes) {}
  template <typename T>
  bool get(T* data, std::size_t count) {
    if (count > rest_.size() / sizeof(T)) return false;
    if (count > 0) std::memcpy(data, rest_.data(), count * sizeof(T));
    rest_ = rest_.subspan(count * sizeof(T));
    return true;
  }
  [[nodiscard]] std::span<const std::byte> rest() const { return rest_; }

 private:
  std::span<const std::byte> rest_;
};

}  // namespace windrow
