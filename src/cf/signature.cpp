// File signatures and the length a header demands. The library itself opens truncated classic files without a word and
// reads zeros, so the header is walked here.
// Sources: NetCDF Classic Format Specification (netCDF-C documentation, "File Format Specifications"): CDF-1, -2, -5;
// HDF5 File Format Specification 3.0, section II.A (superblock).
#include "signature.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cstdint>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <optional>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/cf/dataset.h"

namespace windrow::cf {

namespace {

enum class Format { none, classic, hdf5 };
struct Signature {
  Format format = Format::none;
  int version = 0;           ///< classic: 1, 2 or 5
  std::uint64_t offset = 0;  ///< hdf5: where the superblock starts
};

constexpr std::array<char, 8> kHdf5 = {'\x89', 'H', 'D', 'F', '\r', '\n', '\x1a', '\n'};

Signature signature_of(std::ifstream& file, std::uint64_t size) {
  std::array<char, 8> head{};
  file.read(head.data(), 4);
  if (file.gcount() == 4 && head[0] == 'C' && head[1] == 'D' && head[2] == 'F' &&
      (head[3] == 1 || head[3] == 2 || head[3] == 5))
    return {Format::classic, head[3], 0};
  for (std::uint64_t offset = 0; offset + 8 <= size; offset = offset == 0 ? 512 : 2 * offset) {
    file.clear();
    file.seekg(static_cast<std::streamoff>(offset));
    file.read(head.data(), 8);
    if (file.gcount() == 8 && head == kHdf5) return {Format::hdf5, 0, offset};
  }
  return {};
}

/// The header ended before it was complete.
struct HeaderCut {};
/// The header is complete but not what the format allows.
struct HeaderOdd {};

/// Walks a classic header (big-endian).
class ClassicHeader {
 public:
  ClassicHeader(std::ifstream& file, int version, std::uint64_t size) : file_(file), version_(version), size_(size) {}

  /// Bytes the file must have at least; the padding after the very last value may be missing.
  std::uint64_t required() {
    const std::uint64_t records = count();
    const bool streaming = records == (version_ == 5 ? ~std::uint64_t{0} : 0xFFFFFFFFu);
    read_dimensions();
    skip_attributes();
    read_variables();
    std::uint64_t needed = position_, record = 0;
    for (const Variable& var : variables_)
      if (var.record) record += record_variables_ > 1 ? padded(var.bytes) : var.bytes;
    for (const Variable& var : variables_) {
      if (!var.record)
        needed = std::max(needed, var.begin + var.bytes);
      else if (records > 0 && !streaming)
        needed = std::max(needed, var.begin + (records - 1) * record + var.bytes);
    }
    return needed;
  }

 private:
  struct Variable {
    std::uint64_t begin = 0, bytes = 0;  ///< bytes: unpadded, of one record for record variables
    bool record = false;
  };

  static std::uint64_t padded(std::uint64_t bytes) { return (bytes + 3) / 4 * 4; }

  std::uint64_t integer(int bytes) {
    std::array<unsigned char, 8> raw{};
    file_.read(reinterpret_cast<char*>(raw.data()), bytes);
    if (file_.gcount() != bytes) throw HeaderCut{};
    position_ += bytes;
    std::uint64_t value = 0;
    for (int i = 0; i < bytes; ++i) value = value << 8 | raw[i];
    return value;
  }
  std::uint64_t count() { return integer(version_ == 5 ? 8 : 4); }
  void skip(std::uint64_t bytes) {
    if (bytes > size_ || position_ + bytes > size_) throw HeaderCut{};
    position_ += bytes;
    file_.seekg(static_cast<std::streamoff>(position_));
  }
  void skip_name() { skip(padded(count())); }
  static std::uint64_t type_bytes(std::uint64_t type) {
    static constexpr std::array<std::uint64_t, 12> bytes = {0, 1, 1, 2, 4, 4, 8, 1, 2, 4, 8, 8};
    if (type == 0 || type >= bytes.size()) throw HeaderOdd{};
    return bytes[type];
  }
  /// Reads a list's tag and its number of elements (0 for ABSENT).
  std::uint64_t list(std::uint64_t expected_tag) {
    const std::uint64_t tag = integer(4), elements = count();
    if (tag != expected_tag && (tag != 0 || elements != 0)) throw HeaderOdd{};
    if (elements > size_) throw HeaderCut{};  // every element takes some bytes
    return elements;
  }

  void read_dimensions() {
    for (std::uint64_t n = list(10); n > 0; --n) {
      skip_name();
      lengths_.push_back(count());
    }
  }
  void skip_attributes() {
    for (std::uint64_t n = list(12); n > 0; --n) {
      skip_name();
      const std::uint64_t bytes = type_bytes(integer(4)), elements = count();
      if (elements > size_) throw HeaderCut{};
      skip(padded(bytes * elements));
    }
  }
  void read_variables() {
    for (std::uint64_t n = list(11); n > 0; --n) {
      skip_name();
      Variable var;
      const std::uint64_t rank = count();
      if (rank > 1024) throw HeaderOdd{};
      std::uint64_t values = 1;
      for (std::uint64_t i = 0; i < rank; ++i) {
        const std::uint64_t dim = count();
        if (dim >= lengths_.size()) throw HeaderOdd{};
        if (lengths_[dim] == 0 && i == 0)
          var.record = true;
        else if (__builtin_mul_overflow(values, lengths_[dim], &values))
          throw HeaderOdd{};
      }
      skip_attributes();
      if (__builtin_mul_overflow(values, type_bytes(integer(4)), &var.bytes)) throw HeaderOdd{};
      count();  // vsize: redundant, and wrong by rule for large variables
      var.begin = integer(version_ == 1 ? 4 : 8);
      if (var.begin > (std::uint64_t{1} << 62) || var.bytes > (std::uint64_t{1} << 62)) throw HeaderOdd{};
      if (var.record) ++record_variables_;
      variables_.push_back(var);
    }
  }

  std::ifstream& file_;
  int version_;
  std::uint64_t size_, position_ = 4;
  std::vector<std::uint64_t> lengths_;
  std::vector<Variable> variables_;
  std::size_t record_variables_ = 0;
};

/// End-of-file address of the superblock, or nothing when it cannot be understood.
std::optional<std::uint64_t> hdf5_required(std::ifstream& file, std::uint64_t offset) {
  std::array<unsigned char, 128> raw{};
  file.clear();
  file.seekg(static_cast<std::streamoff>(offset));
  file.read(reinterpret_cast<char*>(raw.data()), raw.size());
  const std::size_t got = file.gcount();
  if (got < 16) throw HeaderCut{};
  const int version = raw[8];
  std::size_t width = 0, end = 0;  // width of an address; where the end-of-file address stands
  if (version <= 1) {
    width = raw[13];
    end = (version == 0 ? 24 : 28) + 2 * width;  // after base address and free-space address
  } else if (version <= 3) {
    width = raw[9];
    end = 12 + 2 * width;  // after base address and superblock extension address
  } else {
    return std::nullopt;
  }
  if (width != 4 && width != 8) return std::nullopt;
  if (end + width > got) throw HeaderCut{};
  std::uint64_t value = 0;
  for (std::size_t i = width; i-- > 0;) value = value << 8 | raw[end + i];
  return value == ~std::uint64_t{0} ? std::nullopt : std::optional(value);
}

}  // namespace

bool looks_like_netcdf(const std::string& path) {
  std::error_code error;
  if (!std::filesystem::is_regular_file(path, error)) return false;
  const std::uint64_t size = std::filesystem::file_size(path, error);
  std::ifstream file(path, std::ios::binary);
  return !error && file && signature_of(file, size).format != Format::none;
}

void check_readable(const std::string& path) {
  std::error_code error;
  const auto status = std::filesystem::status(path, error);
  if (status.type() == std::filesystem::file_type::not_found) throw Error(Failure::missing, path, "no such file");
  if (error) throw Error(Failure::io, path, error.message());
  if (!std::filesystem::is_regular_file(status)) throw Error(Failure::data, path, "not a regular file");
  const std::uint64_t size = std::filesystem::file_size(path, error);
  std::ifstream file(path, std::ios::binary);
  if (error || !file) throw Error(Failure::io, path, fmt::format("cannot be opened: {}", std::strerror(errno)));

  const Signature signature = signature_of(file, size);
  if (signature.format == Format::none)
    throw Error(Failure::data, path, "not a NetCDF file (classic, 64-bit offset or netCDF-4)");
  try {
    std::optional<std::uint64_t> required;
    if (signature.format == Format::classic) {
      file.clear();
      file.seekg(4);
      required = ClassicHeader(file, signature.version, size).required();
    } else {
      required = hdf5_required(file, signature.offset);
    }
    if (required && size < *required)
      throw Error(Failure::data, path,
                  fmt::format("the file is truncated: {} bytes, the header asks for {}", size, *required));
  } catch (const HeaderCut&) {
    throw Error(Failure::data, path, fmt::format("the file is truncated: {} bytes, the header itself is longer", size));
  } catch (const HeaderOdd&) {
    throw Error(Failure::data, path, "the header is damaged: it does not follow the classic format");
  }
}

}  // namespace windrow::cf
