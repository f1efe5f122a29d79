// A file's structure and the values of its small variables. Meaning is given to them in axes, grid and time_axis.
#include "header.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <sstream>

namespace windrow::cf {

namespace {

/// Coordinates are read whole; a damaged header must not ask for all memory.
constexpr std::size_t kMostValues = std::size_t{1} << 26;

}  // namespace

const nc::Var* Header::find(const std::string& name) const {
  for (const nc::Var& var : vars)
    if (var.name == name) return &var;
  return nullptr;
}

const nc::Dim& Header::dim(int id) const {
  for (const nc::Dim& candidate : dims)
    if (candidate.id == id) return candidate;
  throw Error(Failure::data, path, "a variable uses a dimension that is not in the root group");
}

std::string Header::text(const std::string& name) const {
  for (const nc::Att& att : global)
    if (att.name == name) return att.text;
  return {};
}

std::string Header::shape_text(const nc::Var& variable) const {
  std::string text;
  for (const int id : variable.dims) text += (text.empty() ? "" : ", ") + dim(id).name;
  return "(" + text + ")";
}

Header read_header(const nc::File& file) {
  return {file.path(), file.dimensions(), file.variables(), file.global_attributes()};
}

std::vector<std::string> words(const std::string& text) {
  std::istringstream stream(text);
  std::vector<std::string> list;
  for (std::string word; stream >> word;) list.push_back(word);
  return list;
}

std::string lower(const std::string& text) {
  std::string result = text;
  std::ranges::transform(result, result.begin(), [](char c) { return c >= 'A' && c <= 'Z' ? char(c - 'A' + 'a') : c; });
  return result;
}

std::size_t raw_size(const nc::File& file, const nc::Var& variable) {
  const std::size_t size = file.size(variable);
  if (size > kMostValues)
    throw Error(Failure::data, file.path(), fmt::format("coordinate '{}' is too large for one", variable.name));
  return size;
}

std::vector<double> raw_coordinate(const nc::File& file, const nc::Var& variable) {
  if (nc::type_size(variable.type) == 0 || variable.type == NC_CHAR)
    throw Error(Failure::data, file.path(),
                fmt::format("coordinate '{}' holds {} values, numbers were expected", variable.name,
                            nc::type_name(variable.type)));
  raw_size(file, variable);
  return file.doubles(variable);
}

std::vector<double> coordinate_values(const nc::File& file, const nc::Var& variable, const nc::Var* parent) {
  std::vector<double> values = raw_coordinate(file, variable);
  const auto number = [&](const char* name, double otherwise) {
    const nc::Att* att = variable.find(name);
    if (att == nullptr && parent != nullptr) att = parent->find(name);
    return att != nullptr && !att->numbers.empty() ? att->numbers[0] : otherwise;
  };
  const double scale = number("scale_factor", 1), offset = number("add_offset", 0);
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (scale != 1 || offset != 0) values[i] = values[i] * scale + offset;
    if (!std::isfinite(values[i]))
      throw Error(Failure::data, file.path(),
                  fmt::format("coordinate '{}' is not finite at position {}", variable.name, i));
  }
  return values;
}

}  // namespace windrow::cf
