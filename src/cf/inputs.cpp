// Reading coordinates from one or two files in the order of dimensions that is asked for.
#include "inputs.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <numbers>

#include "roles.h"
#include "values.h"

namespace windrow::cf {

namespace {

/// Ids of dimensions that only the file of coordinates has start here.
constexpr int kForeign = 1 << 20;

bool horizontal(Role role) { return role == Role::latitude || role == Role::longitude; }

/// Is the dimension time or height, by its own coordinate variable? No coordinate file's dimension is taken for it.
bool never_horizontal(const Header& header, const nc::Dim& dim) {
  const nc::Var* own = header.find(dim.name);
  const Role role = own != nullptr ? role_of(*own) : Role::unknown;
  return role == Role::time || role == Role::vertical;
}

/// Which dimension of the data each dimension of the coordinate file is: the one of the same name and length; of those
/// that latitudes and longitudes have, else (said) the next of the same length. Others are not in the map.
std::map<int, int> match_dimensions(const Header& header, const nc::Var& variable, const Header& theirs,
                                    Remarks& remarks) {
  std::map<int, int> matches;
  const auto free = [&](int own_id, const nc::Dim& dim) {
    const nc::Dim& own = header.dim(own_id);
    return own.length == dim.length && !never_horizontal(header, own) &&
           std::ranges::none_of(matches, [&](const auto& m) { return m.second == own_id; });
  };
  for (const nc::Dim& dim : theirs.dims)
    for (const int own_id : variable.dims)
      if (header.dim(own_id).name == dim.name && free(own_id, dim)) matches[dim.id] = own_id;
  for (const nc::Var& var : theirs.vars) {
    if (!horizontal(role_of(var))) continue;
    for (const int id : var.dims) {
      const nc::Dim& dim = theirs.dim(id);
      const auto own = std::ranges::find_if(variable.dims, [&](int own_id) { return free(own_id, dim); });
      if (matches.contains(id) || own == variable.dims.end()) continue;
      matches[id] = *own;
      if (dim.length > 1)
        remarks.push_back(fmt::format("dimension '{}' of {} is taken for '{}', which is as long", dim.name, theirs.path,
                                      header.dim(*own).name));
    }
  }
  return matches;
}

/// `data`, whose dimensions have these lengths, with dimension source[i] in place i.
std::vector<double> reorder(const std::vector<double>& data, const std::vector<std::size_t>& lengths,
                            const std::vector<std::size_t>& source) {
  const std::size_t rank = lengths.size();
  std::vector<std::size_t> strides(rank, 1), index(rank, 0);
  for (std::size_t i = rank; i-- > 1;) strides[i - 1] = strides[i] * lengths[i];
  std::vector<double> result(data.size());
  for (double& value : result) {
    std::size_t at = 0;
    for (std::size_t i = 0; i < rank; ++i) at += index[i] * strides[source[i]];
    value = data[at];
    for (std::size_t i = rank; i-- > 0;) {
      if (++index[i] < lengths[source[i]]) break;
      index[i] = 0;
    }
  }
  return result;
}

}  // namespace

void refuse_repeated_dims(const Header& header, const nc::Var& variable, const std::string& place) {
  for (std::size_t i = 0; i < variable.dims.size(); ++i)
    if (std::ranges::count(variable.dims, variable.dims[i]) > 1)
      throw Error(
          Failure::data, place,
          fmt::format("variable '{}' has the dimension '{}' twice", variable.name, header.dim(variable.dims[i]).name));
}

Inputs::Inputs(const nc::File& file, Header header)
    : file_(file), header_(std::move(header)), own_(header_.vars.size()) {}

const nc::File& Inputs::file_of(const nc::Var& variable) const {
  return std::size_t(&variable - header_.vars.data()) < own_ ? file_ : *other_;
}

const std::string& Inputs::place(const nc::Var& variable) const { return file_of(variable).path(); }

void Inputs::borrow(const nc::File& other, const nc::Var variable, Remarks& remarks) {
  const Header theirs = read_header(other);
  const std::map<int, int> matches = match_dimensions(header_, variable, theirs, remarks);
  const std::string mesh = variable.text("mesh");
  std::vector<nc::Var> borrowed;
  bool latitude = false, longitude = false, topology = false;
  for (nc::Var var : theirs.vars) {
    if (role_of(var) == Role::time) continue;
    bool fits = true;
    for (int& id : var.dims) {
      const auto match = matches.find(id);
      fits = fits && (match != matches.end() || theirs.dim(id).length == 1);
      id = match != matches.end() ? match->second : id + kForeign;
    }
    latitude = latitude || (fits && role_of(var) == Role::latitude);
    longitude = longitude || (fits && role_of(var) == Role::longitude);
    topology = topology || (!mesh.empty() && var.name == mesh);
    borrowed.push_back(std::move(var));
  }
  if (!topology && (!latitude || !longitude))
    throw Error(Failure::data, other.path(),
                fmt::format("holds no latitudes and longitudes whose dimensions fit those of variable '{}', {}, in {}",
                            variable.name, header_.shape_text(variable), header_.path));
  std::erase_if(borrowed, [&](const nc::Var& var) { return var.name == variable.name; });
  std::erase_if(header_.vars, [&](const nc::Var& own) {
    return own.name != variable.name && role_of(own) != Role::time &&
           (horizontal(role_of(own)) ||
            std::ranges::any_of(borrowed, [&](const nc::Var& var) { return var.name == own.name; }));
  });
  std::erase_if(borrowed, [&](const nc::Var& var) { return header_.find(var.name) != nullptr; });
  own_ = header_.vars.size();
  for (nc::Dim dim : theirs.dims) {
    dim.id += kForeign;
    header_.dims.push_back(dim);
  }
  header_.vars.insert(header_.vars.end(), borrowed.begin(), borrowed.end());
  other_ = &other;
}

std::vector<double> Inputs::values(const nc::Var& variable, const nc::Var* parent) const {
  return coordinate_values(file_of(variable), variable, parent);
}

std::vector<double> Inputs::over(const nc::Var& variable, const std::vector<int>& dims, const nc::Var* parent) const {
  std::vector<std::size_t> lengths, source;  // of the variable's dimensions that count; where each wanted one stands
  std::vector<int> counted;
  refuse_repeated_dims(header_, variable, place(variable));
  for (const int id : variable.dims) {
    const bool wanted = std::ranges::find(dims, id) != dims.end();
    if (!wanted && header_.dim(id).length != 1)
      throw Error(Failure::defect, place(variable), "coordinate " + variable.name + " asked without a dimension");
    if (!wanted) continue;
    counted.push_back(id);
    lengths.push_back(header_.dim(id).length);
  }
  for (const int id : dims) source.push_back(std::size_t(std::ranges::find(counted, id) - counted.begin()));
  if (counted.size() != dims.size())
    throw Error(Failure::defect, place(variable), "coordinate " + variable.name + " lacks a dimension");

  std::vector<double> stored = raw_coordinate(file_of(variable), variable);
  Remarks unused;
  Decoding decoding = read_decoding(header_, variable, unused);
  const auto number = [&](const char* name, double otherwise) {
    const nc::Att* att = parent != nullptr && variable.find(name) == nullptr ? parent->find(name) : nullptr;
    return att != nullptr && att->numbers.size() == 1 ? att->numbers[0] : otherwise;
  };
  if (parent != nullptr) {
    decoding.scale = number("scale_factor", decoding.scale);
    decoding.offset = number("add_offset", decoding.offset);
    for (const char* name : {"_FillValue", "missing_value"})
      if (const double fill = number(name, std::nan("")); !std::isnan(fill)) decoding.missing.push_back(fill);
  }
  std::string units = variable.text("units");
  if (units.empty() && parent != nullptr) units = parent->text("units");
  const double turn = is_radian(units) ? 180 / std::numbers::pi : 1;
  for (double& value : stored) {
    const bool missing = !std::isfinite(value) || std::ranges::find(decoding.missing, value) != decoding.missing.end();
    value = missing ? std::numeric_limits<double>::quiet_NaN() : (value * decoding.scale + decoding.offset) * turn;
  }
  return reorder(stored, lengths, source);
}

std::vector<std::int64_t> Inputs::integers(const nc::Var& variable) const {
  raw_size(file_of(variable), variable);
  return file_of(variable).integers(variable);
}

}  // namespace windrow::cf
