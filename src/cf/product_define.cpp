// Defining a product with netCDF-C. Chunk data are none of this file's business.
#include "product_define.h"

#include <cerrno>
#include <cstring>
#include <map>

#include "nc_file.h"
#include "product_layout.h"
#include "windrow/base/error.h"

namespace windrow::cf {

std::string output_reason(int error_number, const std::string& library_text) {
  switch (error_number) {
    case ENOSPC:
    case EDQUOT:
    case EACCES:
    case EPERM:
    case EROFS:
    case ENOENT:
    case ENOTDIR:
    case EFBIG:
    case EIO:
      return std::strerror(error_number);
    default:
      return library_text;
  }
}

namespace {

/// Runs one library call under the mutex; Error(output) with the system's reason when it fails.
template <class Call>
void output(const std::string& path, Call call) {
  const nc::LibraryLock lock;
  errno = 0;
  const int status = call();
  if (status == NC_NOERR) return;
  throw Error(Failure::output, path,
              "cannot be written: " + output_reason(status > 0 ? status : errno, nc_strerror(status)));
}

nc_type library_type(Type type) {
  switch (type) {
    case Type::text:
      return NC_CHAR;
    case Type::int8:
      return NC_BYTE;
    case Type::int32:
      return NC_INT;
    case Type::float32:
      return NC_FLOAT;
    case Type::float64:
      break;
  }
  return NC_DOUBLE;
}

/// Text is NC_CHAR, which every reader knows (several stumble over NC_STRING).
struct PutAttribute {
  int file, variable;
  const char* name;
  int operator()(const std::string& v) const { return nc_put_att_text(file, variable, name, v.size(), v.data()); }
  int operator()(double v) const { return nc_put_att_double(file, variable, name, NC_DOUBLE, 1, &v); }
  int operator()(float v) const { return nc_put_att_float(file, variable, name, NC_FLOAT, 1, &v); }
  int operator()(std::int32_t v) const { return nc_put_att_int(file, variable, name, NC_INT, 1, &v); }
  int operator()(std::int64_t v) const {
    const long long wide = v;
    return nc_put_att_longlong(file, variable, name, NC_INT64, 1, &wide);
  }
  int operator()(std::int8_t v) const { return nc_put_att_schar(file, variable, name, NC_BYTE, 1, &v); }
  int operator()(const std::vector<double>& v) const {
    return nc_put_att_double(file, variable, name, NC_DOUBLE, v.size(), v.data());
  }
  int operator()(const std::vector<std::int8_t>& v) const {
    return nc_put_att_schar(file, variable, name, NC_BYTE, v.size(), v.data());
  }
};

class Definer {
 public:
  Definer(const std::string& path, const ProductFile& product)
      : path_(path), product_(product), file_(create(path)), id_(file_.id()) {}

  void run() {
    for (const Dimension& d : product_.dimensions)
      output(path_,
             [&] { return nc_def_dim(id_, d.name.c_str(), d.unlimited ? NC_UNLIMITED : d.length, &dims_[d.name]); });
    for (const SmallVariable& v : product_.small) define_small(v);
    for (const ChunkedVariable& v : product_.chunked) define_chunked(v);
    put_attributes(NC_GLOBAL, product_.global);
    output(path_, [&] { return nc_enddef(id_); });
    for (const SmallVariable& v : product_.small)
      if (!v.deflate) put_values(v);
    close();
  }

 private:
  static nc::File create(const std::string& path) {
    errno = 0;
    try {
      return nc::File::create(path, NC_NETCDF4 | NC_CLOBBER);
    } catch (const Error& e) {
      throw Error(Failure::output, path, "cannot be created: " + output_reason(errno, e.what()));
    }
  }

  int define(const std::string& name, nc_type type, const std::vector<std::string>& dimensions) {
    std::vector<int> ids;
    for (const auto& d : dimensions) ids.push_back(dims_.at(d));
    int variable = -1;
    output(path_,
           [&] { return nc_def_var(id_, name.c_str(), type, static_cast<int>(ids.size()), ids.data(), &variable); });
    return variable;
  }

  /// Without fill, because every chunk is written; shuffle before deflate, as the chunk writer packs them.
  void define_filters(int variable, const std::vector<std::size_t>& chunk, int level) {
    output(path_, [&] { return nc_def_var_chunking(id_, variable, NC_CHUNKED, chunk.data()); });
    output(path_, [&] { return nc_def_var_fill(id_, variable, NC_NOFILL, nullptr); });
    if (level > 0) output(path_, [&] { return nc_def_var_deflate(id_, variable, 1, 1, level); });
  }

  void define_small(const SmallVariable& v) {
    const int variable = define(v.name, library_type(v.type), v.dimensions);
    const auto chunk = small_chunk(product_, v);
    if (v.deflate)
      define_filters(variable, chunk, 1);
    else if (!chunk.empty())
      output(path_, [&] { return nc_def_var_chunking(id_, variable, NC_CHUNKED, chunk.data()); });
    put_attributes(variable, v.attributes);
    small_ids_[v.name] = variable;
  }

  void define_chunked(const ChunkedVariable& v) {
    const int variable = define(v.name, NC_FLOAT, v.dimensions);
    define_filters(variable, v.chunk, v.level);
    put_attributes(variable, {{"_FillValue", v.fill_value}});
    put_attributes(variable, v.attributes);
  }

  void put_attributes(int variable, const std::vector<NamedValue>& attributes) {
    for (const NamedValue& a : attributes)
      output(path_, [&] { return std::visit(PutAttribute{id_, variable, a.name.c_str()}, a.value); });
  }

  void put_values(const SmallVariable& v) {
    std::vector<std::byte> bytes(v.values.size() * bytes_of(v.type));
    encode(v, v.values, bytes);
    const auto count = lengths(product_, v.dimensions);
    const std::vector<std::size_t> start(count.size(), 0);
    const int variable = small_ids_.at(v.name);
    output(path_, [&] { return nc_put_vara(id_, variable, start.data(), count.data(), bytes.data()); });
  }

  void close() {
    errno = 0;
    try {
      file_.close(Failure::output);
    } catch (const Error& e) {
      throw Error(Failure::output, path_, "cannot be written: " + output_reason(errno, e.what()));
    }
  }

  const std::string& path_;
  const ProductFile& product_;
  nc::File file_;
  int id_;
  std::map<std::string, int> dims_, small_ids_;
};

}  // namespace

void define_product(const std::string& path, const ProductFile& product) { Definer(path, product).run(); }

}  // namespace windrow::cf
