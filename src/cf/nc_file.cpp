// The library mutex and the thin RAII over netCDF-C. Nothing here knows CF.
#include "nc_file.h"

#include <hdf5.h>

#include <algorithm>
#include <utility>

namespace windrow::cf {

std::mutex& library_mutex() {
  static std::mutex mutex;
  return mutex;
}

namespace nc {

LibraryLock::LibraryLock() : lock_(library_mutex()) {
  // A thread-safe HDF5 keeps its error printing per thread; netCDF turns it off in one thread only.
  thread_local const bool silenced = H5Eset_auto2(H5E_DEFAULT, nullptr, nullptr) >= 0;
  static_cast<void>(silenced);
}

namespace {

std::string read_strings(int file, int variable, const std::string& name, std::size_t count, const std::string& path) {
  std::vector<char*> strings(count, nullptr);
  check(nc_get_att_string(file, variable, name.c_str(), strings.data()), path, "attribute " + name);
  std::string joined;
  for (std::size_t i = 0; i < count; ++i) {
    if (i > 0) joined += ' ';
    if (strings[i] != nullptr) joined += strings[i];
  }
  nc_free_string(count, strings.data());
  return joined;
}

Att read_attribute(int file, int variable, int index, const std::string& path) {
  char name[NC_MAX_NAME + 1] = {};
  check(nc_inq_attname(file, variable, index, name), path, "attribute");
  Att att;
  att.name = name;
  std::size_t count = 0;
  check(nc_inq_att(file, variable, name, &att.type, &count), path, "attribute " + att.name);
  if (att.type == NC_CHAR) {
    att.text.resize(count);
    if (count > 0) check(nc_get_att_text(file, variable, name, att.text.data()), path, "attribute " + att.name);
    while (!att.text.empty() && att.text.back() == '\0') att.text.pop_back();
  } else if (att.type == NC_STRING) {
    att.text = read_strings(file, variable, att.name, count, path);
  } else if (type_size(att.type) > 0) {
    att.numbers.resize(count);
    if (count > 0) check(nc_get_att_double(file, variable, name, att.numbers.data()), path, "attribute " + att.name);
  }  // user-defined types are kept by name only
  return att;
}

std::vector<Att> read_attributes(int file, int variable, const std::string& path) {
  int count = 0;
  check(variable == NC_GLOBAL ? nc_inq_natts(file, &count) : nc_inq_varnatts(file, variable, &count), path,
        "attributes");
  std::vector<Att> atts;
  for (int i = 0; i < count; ++i) atts.push_back(read_attribute(file, variable, i, path));
  return atts;
}

}  // namespace

void check(int status, const std::string& place, const std::string& what, Failure kind) {
  if (status == NC_NOERR) return;
  const std::string named = what.empty() ? std::string() : what + ": ";
  // Of a chunk that does not unpack or an object that is not where the file says, HDF5 tells no more.
  if (kind == Failure::io && (status == NC_EHDFERR || status == NC_EFILTER))
    throw Error(Failure::data, place, named + "the file is damaged: HDF5 cannot read it");
  throw Error(kind, place, named + nc_strerror(status));
}

const Att* Var::find(const std::string& wanted) const {
  for (const Att& att : attributes)
    if (att.name == wanted) return &att;
  return nullptr;
}

std::string Var::text(const std::string& wanted) const {
  const Att* att = find(wanted);
  return att != nullptr ? att->text : std::string();
}

std::size_t type_size(nc_type type) {
  switch (type) {
    case NC_BYTE:
    case NC_CHAR:
    case NC_UBYTE:
      return 1;
    case NC_SHORT:
    case NC_USHORT:
      return 2;
    case NC_INT:
    case NC_UINT:
    case NC_FLOAT:
      return 4;
    case NC_DOUBLE:
    case NC_INT64:
    case NC_UINT64:
      return 8;
    default:
      return 0;
  }
}

std::string type_name(nc_type type) {
  static const char* const names[] = {"unknown", "byte",   "char", "short", "int",    "float", "double",
                                      "ubyte",   "ushort", "uint", "int64", "uint64", "string"};
  return type >= 0 && type <= NC_STRING ? names[type] : "user-defined";
}

File File::open(const std::string& path) {
  const LibraryLock lock;
  int id = -1;
  const int status = nc_open(path.c_str(), NC_NOWRITE, &id);
  if (status == NC_EHDFERR)
    throw Error(Failure::io, path, "cannot be opened: the file is damaged, or another process has it open for writing");
  check(status, path, "");
  return {id, path};
}

File File::create(const std::string& path, int mode) {
  const LibraryLock lock;
  int id = -1;
  check(nc_create(path.c_str(), mode, &id), path, "", Failure::output);
  return {id, path};
}

File::File(File&& other) noexcept : id_(std::exchange(other.id_, -1)), path_(std::move(other.path_)) {}

File& File::operator=(File&& other) noexcept {
  std::swap(id_, other.id_);
  std::swap(path_, other.path_);
  return *this;
}

File::~File() {
  if (id_ < 0) return;
  const LibraryLock lock;
  nc_close(id_);
}

void File::close(Failure kind) {
  if (id_ < 0) return;
  const LibraryLock lock;
  check(nc_close(std::exchange(id_, -1)), path_, "closing", kind);
}

std::vector<Dim> File::dimensions() const {
  const LibraryLock lock;
  int count = 0;
  check(nc_inq_dimids(id_, &count, nullptr, 0), path_, "dimensions");
  std::vector<int> ids(count);
  check(nc_inq_dimids(id_, &count, ids.data(), 0), path_, "dimensions");
  int unlimited_count = 0;
  check(nc_inq_unlimdims(id_, &unlimited_count, nullptr), path_, "dimensions");
  std::vector<int> unlimited(unlimited_count);
  check(nc_inq_unlimdims(id_, &unlimited_count, unlimited.data()), path_, "dimensions");
  std::vector<Dim> dims;
  for (const int id : ids) {
    char name[NC_MAX_NAME + 1] = {};
    Dim dim;
    dim.id = id;
    check(nc_inq_dim(id_, id, name, &dim.length), path_, "dimensions");
    dim.name = name;
    for (const int other : unlimited) dim.unlimited |= other == id;
    dims.push_back(dim);
  }
  return dims;
}

std::vector<Att> File::global_attributes() const {
  const LibraryLock lock;
  return read_attributes(id_, NC_GLOBAL, path_);
}

std::vector<Var> File::variables() const {
  const LibraryLock lock;
  int count = 0;
  check(nc_inq_varids(id_, &count, nullptr), path_, "variables");
  std::vector<int> ids(count);
  check(nc_inq_varids(id_, &count, ids.data()), path_, "variables");
  std::vector<Var> vars;
  for (const int id : ids) {
    char name[NC_MAX_NAME + 1] = {};
    Var var;
    var.id = id;
    int rank = 0;
    check(nc_inq_varndims(id_, id, &rank), path_, "variables");
    var.dims.resize(rank);
    check(nc_inq_var(id_, id, name, &var.type, nullptr, var.dims.data(), nullptr), path_, "variables");
    var.name = name;
    var.attributes = read_attributes(id_, id, path_);
    vars.push_back(std::move(var));
  }
  return vars;
}

std::size_t File::size(const Var& variable) const {
  const LibraryLock lock;
  std::size_t count = 1;
  std::vector<int> dims(variable.dims.size());  // as the file numbers them
  check(nc_inq_vardimid(id_, variable.id, dims.data()), path_, "variable " + variable.name);
  for (const int dim : dims) {
    std::size_t length = 0;
    check(nc_inq_dimlen(id_, dim, &length), path_, "variable " + variable.name);
    count *= length;
  }
  return count;
}

std::vector<double> File::doubles(const Var& variable) const {
  std::vector<double> values(size(variable));
  const LibraryLock lock;
  if (!values.empty()) check(nc_get_var_double(id_, variable.id, values.data()), path_, "variable " + variable.name);
  return values;
}

std::vector<std::int64_t> File::integers(const Var& variable) const {
  const bool whole = type_size(variable.type) > 0 && variable.type != NC_CHAR && variable.type != NC_FLOAT &&
                     variable.type != NC_DOUBLE;
  if (!whole)
    throw Error(
        Failure::data, path_,
        "variable '" + variable.name + "' holds " + type_name(variable.type) + " values, integers were expected");
  std::vector<long long> values(size(variable));
  const LibraryLock lock;
  const int status = values.empty() ? NC_NOERR : nc_get_var_longlong(id_, variable.id, values.data());
  if (status == NC_ERANGE)
    throw Error(Failure::data, path_, "variable '" + variable.name + "' holds a number that is beyond any index");
  check(status, path_, "variable " + variable.name);
  return {values.begin(), values.end()};
}

std::vector<std::string> File::texts(const Var& variable, std::size_t count) const {
  const std::size_t values = size(variable);
  const bool rows = variable.type == NC_CHAR && count > 0 && values % count == 0;
  if (!rows && values != count)
    throw Error(Failure::data, path_,
                "variable '" + variable.name + "' holds " + std::to_string(values) + " texts, " +
                    std::to_string(count) + " were expected");
  std::vector<std::string> out;
  if (variable.type == NC_STRING) {
    std::vector<char*> strings(values, nullptr);
    const LibraryLock lock;
    if (!strings.empty()) check(nc_get_var_string(id_, variable.id, strings.data()), path_, variable.name);
    for (const char* text : strings) out.emplace_back(text == nullptr ? "" : text);
    nc_free_string(values, strings.data());
  } else if (rows) {
    std::string all(values, '\0');
    const LibraryLock lock;
    check(nc_get_var_text(id_, variable.id, all.data()), path_, "variable " + variable.name);
    for (std::size_t i = 0; i < count; ++i) out.push_back(all.substr(i * (values / count), values / count));
  } else {
    for (const std::int64_t number : integers(variable)) out.push_back(std::to_string(number));
  }
  for (std::string& text : out) {
    text.resize(std::min(text.size(), text.find('\0')));
    while (!text.empty() && text.back() == ' ') text.pop_back();
  }
  return out;
}

void File::raw(const Var& variable, std::span<const std::size_t> start, std::span<const std::size_t> count,
               void* out) const {
  const LibraryLock lock;
  check(nc_get_vara(id_, variable.id, start.data(), count.data(), out), path_, "variable " + variable.name);
}

std::vector<std::size_t> File::chunking(const Var& variable) const {
  const LibraryLock lock;
  std::vector<std::size_t> lengths(variable.dims.size());
  int storage = NC_CONTIGUOUS;
  if (lengths.empty()) return {};
  check(nc_inq_var_chunking(id_, variable.id, &storage, lengths.data()), path_, "variable " + variable.name);
  return storage == NC_CHUNKED ? lengths : std::vector<std::size_t>();
}

Attribute to_record(const Att& attribute) { return {attribute.name, attribute.text, attribute.numbers}; }

}  // namespace nc
}  // namespace windrow::cf
