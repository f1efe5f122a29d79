// One file's structure, read once: dimensions, variables, attributes; and the remarks made while understanding it.
#pragma once
#include <string>
#include <vector>

#include "nc_file.h"

namespace windrow::cf {

struct Header {
  std::string path;
  std::vector<nc::Dim> dims;
  std::vector<nc::Var> vars;
  std::vector<nc::Att> global;
  [[nodiscard]] const nc::Var* find(const std::string& name) const;  ///< null when absent
  [[nodiscard]] const nc::Dim& dim(int id) const;
  [[nodiscard]] std::string text(const std::string& name) const;  ///< of a global attribute; empty when absent
  /// "(time, lat, lon)"
  [[nodiscard]] std::string shape_text(const nc::Var& variable) const;
};

Header read_header(const nc::File& file);

/// Oddities of one file, as sentences; they become Notices once per run rather than once per file.
using Remarks = std::vector<std::string>;

/// Blank-separated words of an attribute.
std::vector<std::string> words(const std::string& text);
std::string lower(const std::string& text);

/// Number of values, where it is one a coordinate may have. Error(data) for absurd sizes.
std::size_t raw_size(const nc::File& file, const nc::Var& variable);
/// Stored numbers of a coordinate or bounds variable. Error(data) for text variables and for absurd sizes.
std::vector<double> raw_coordinate(const nc::File& file, const nc::Var& variable);

/// Values of a coordinate or bounds variable, unpacked when it is packed. `parent` lends its scale where a bounds
/// variable has none of its own. Error(data) for text variables and for values that are not finite.
std::vector<double> coordinate_values(const nc::File& file, const nc::Var& variable, const nc::Var* parent = nullptr);

}  // namespace windrow::cf
