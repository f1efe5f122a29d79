// Thin RAII over netCDF-C, shared by reading and writing: files, dimensions, variables, attributes (NC_STRING too).
// Knows the library only: what names and attributes mean (CF) is decided elsewhere in this module.
// (Named so because a private "netcdf.h" would hide the library's own.)
// Every method takes library_mutex() itself; never hold it while calling one. For bare nc_* or H5* calls on id(), take
// a LibraryLock in a scope of their own.
#pragma once
#include <netcdf.h>

#include <cstddef>
#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/cf/dataset.h"

namespace windrow::cf::nc {

/// Holds library_mutex() and keeps HDF5 from printing in this thread. For bare library calls in this module.
class LibraryLock {
 public:
  LibraryLock();

 private:
  std::scoped_lock<std::mutex> lock_;
};

/// Throws Error(kind): `place: what: <the library's text>` unless status is NC_NOERR. Needs no lock.
void check(int status, const std::string& place, const std::string& what, Failure kind = Failure::io);

struct Dim {
  int id = -1;
  std::string name;
  std::size_t length = 0;
  bool unlimited = false;
};

struct Att {
  std::string name;
  nc_type type = NC_NAT;
  std::string text;             ///< NC_CHAR, and NC_STRING joined by blanks; trailing NULs dropped
  std::vector<double> numbers;  ///< all numeric types, converted
  [[nodiscard]] bool is_text() const { return type == NC_CHAR || type == NC_STRING; }
};

struct Var {
  int id = -1;
  std::string name;
  nc_type type = NC_NAT;
  std::vector<int> dims;  ///< dimension ids, slowest first
  std::vector<Att> attributes;
  [[nodiscard]] const Att* find(const std::string& name) const;   ///< null when absent
  [[nodiscard]] std::string text(const std::string& name) const;  ///< empty when absent or numeric
};

/// Bytes of one value of an atomic type; 0 for strings and user-defined types.
std::size_t type_size(nc_type type);
std::string type_name(nc_type type);  ///< "float", "short", ... as CDL writes them

/// A file open for reading or writing; move-only. The destructor closes quietly: who writes calls close() and hears of
/// a full disk.
class File {
 public:
  /// Read-only. Error(io) `path: <library text>`; signature, truncation and absence are checked by check_readable().
  static File open(const std::string& path);
  /// New file, replacing any; `mode` as nc_create's (NC_NETCDF4 | NC_CLOBBER, ...). Error(output).
  static File create(const std::string& path, int mode);
  File(File&& other) noexcept;
  File& operator=(File&& other) noexcept;
  File(const File&) = delete;
  File& operator=(const File&) = delete;
  ~File();

  void close(Failure kind = Failure::io);  ///< checked; does nothing when closed already
  [[nodiscard]] int id() const { return id_; }
  [[nodiscard]] const std::string& path() const { return path_; }

  [[nodiscard]] std::vector<Dim> dimensions() const;
  [[nodiscard]] std::vector<Att> global_attributes() const;
  [[nodiscard]] std::vector<Var> variables() const;           ///< of the root group, in file order
  [[nodiscard]] std::size_t size(const Var& variable) const;  ///< number of values
  /// All values of a numeric variable, converted to double by the library.
  [[nodiscard]] std::vector<double> doubles(const Var& variable) const;
  /// All values of an integer variable, exactly. Error(data) for another type or a value beyond 63 bits.
  [[nodiscard]] std::vector<std::int64_t> integers(const Var& variable) const;
  /// `count` texts of a string variable, of rows of a char variable, or integers as text; trailing NULs and blanks
  /// dropped. Error(data) for other types and other numbers of values.
  [[nodiscard]] std::vector<std::string> texts(const Var& variable, std::size_t count) const;
  /// A hyperslab in the variable's own type and native byte order; `out` holds type_size * product(count) bytes.
  void raw(const Var& variable, std::span<const std::size_t> start, std::span<const std::size_t> count,
           void* out) const;
  /// Chunk lengths, or empty when the variable is contiguous.
  [[nodiscard]] std::vector<std::size_t> chunking(const Var& variable) const;

 private:
  File(int id, std::string path) : id_(id), path_(std::move(path)) {}
  int id_ = -1;
  std::string path_;
};

/// The plain record of an attribute for public interfaces.
Attribute to_record(const Att& attribute);

}  // namespace windrow::cf::nc
