// Builds small NetCDF files with netCDF-C, wrong ones too. Test only; knows nothing of the module under test.
#pragma once
#include <doctest/doctest.h>
#include <netcdf.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <functional>
#include <string>
#include <vector>

#include "windrow/base/error.h"

namespace windrow::cftest {

/// A folder of this process that goes when it ends.
inline std::string scratch(const std::string& name) {
  struct Folder {
    pid_t owner = ::getpid();
    std::filesystem::path path =
        std::filesystem::temp_directory_path() / ("windrow-cf-test-" + std::to_string(::getpid()));
    Folder() { std::filesystem::create_directories(path); }
    ~Folder() {
      if (::getpid() == owner) std::filesystem::remove_all(path);  // a forked child leaves it alone
    }
  };
  static const Folder folder;
  return (folder.path / name).string();
}

class FileBuilder {
 public:
  explicit FileBuilder(const std::string& name, int mode = 0) : path_(scratch(name)) {
    ok(nc_create(path_.c_str(), NC_CLOBBER | mode, &id_));
  }
  FileBuilder& dim(const std::string& name, std::size_t length) {
    int dim = 0;
    ok(nc_def_dim(id_, name.c_str(), length, &dim));
    return *this;
  }
  /// Values are written when the file is finished; attributes that follow belong to this variable.
  FileBuilder& var(const std::string& name, nc_type type, const std::vector<std::string>& dims,
                   std::vector<double> values) {
    std::vector<int> ids;
    for (const std::string& dim : dims) {
      ids.push_back(0);
      ok(nc_inq_dimid(id_, dim.c_str(), &ids.back()));
    }
    ok(nc_def_var(id_, name.c_str(), type, int(ids.size()), ids.data(), &var_));
    pending_.push_back({var_, std::move(values)});
    return *this;
  }
  FileBuilder& chunks(const std::vector<std::size_t>& lengths, bool deflate = true) {
    ok(nc_def_var_chunking(id_, var_, NC_CHUNKED, lengths.data()));
    if (deflate) ok(nc_def_var_deflate(id_, var_, 1, 1, 1));
    return *this;
  }
  FileBuilder& att(const std::string& name, const std::string& text) {
    ok(nc_put_att_text(id_, var_, name.c_str(), text.size(), text.c_str()));
    return *this;
  }
  FileBuilder& att(const std::string& name, nc_type type, const std::vector<double>& numbers) {
    ok(nc_put_att_double(id_, var_, name.c_str(), type, numbers.size(), numbers.data()));
    return *this;
  }
  FileBuilder& strings(const std::string& name, std::vector<const char*> texts) {
    ok(nc_put_att_string(id_, var_, name.c_str(), texts.size(), texts.data()));
    return *this;
  }
  FileBuilder& global() {
    var_ = NC_GLOBAL;
    return *this;
  }
  /// Writes the values and closes; returns the path.
  std::string done() {
    ok(nc_enddef(id_));
    for (const Pending& pending : pending_) put(pending);
    ok(nc_close(id_));
    return path_;
  }

 private:
  struct Pending {
    int var;
    std::vector<double> values;
  };
  static void ok(int status) {
    INFO(nc_strerror(status));
    REQUIRE(status == NC_NOERR);
  }
  void put(const Pending& pending) const {
    if (pending.values.empty()) return;
    int rank = 0;
    ok(nc_inq_varndims(id_, pending.var, &rank));
    std::vector<int> dims(rank);
    ok(nc_inq_vardimid(id_, pending.var, dims.data()));
    std::vector<std::size_t> start(rank, 0), count(rank, 1);
    std::size_t rest = pending.values.size();
    for (int i = rank; i-- > 0;) {
      ok(nc_inq_dimlen(id_, dims[i], &count[i]));
      if (i == 0) count[i] = rest;  // also what an unlimited dimension grows to
      rest /= count[i];
    }
    ok(nc_put_vara_double(id_, pending.var, start.data(), count.data(), pending.values.data()));
  }

  std::string path_;
  int id_ = -1, var_ = NC_GLOBAL;
  std::vector<Pending> pending_;
};

/// first, first + step, ...
inline std::vector<double> steps(double first, double step, std::size_t count) {
  std::vector<double> values;
  for (std::size_t i = 0; i < count; ++i) values.push_back(first + step * double(i));
  return values;
}

inline std::string text_of_file(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  return {std::istreambuf_iterator<char>(file), {}};
}
inline std::string write_file(const std::string& name, const std::string& bytes) {
  std::ofstream(scratch(name), std::ios::binary) << bytes;
  return scratch(name);
}

/// The text of the Error that `action` must throw, without the scratch folder's name.
inline std::string error_text(Failure kind, const std::function<void()>& action) {
  try {
    action();
  } catch (const Error& error) {
    CHECK(int(error.kind()) == int(kind));
    std::string text = error.what();
    const std::string folder = scratch("");
    for (std::size_t at = 0; (at = text.find(folder)) != std::string::npos;) text.erase(at, folder.size());
    return text;
  }
  FAIL("no Error was thrown");
  return {};
}

}  // namespace windrow::cftest
