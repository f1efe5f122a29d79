#include "paths.h"

#include <fmt/format.h>

#include <cstdlib>

#include "windrow/os/files.h"

namespace windrow::job {
namespace {

std::string environment(const Document& document, const std::string& name, Position at, const std::string& key) {
  const char* value = std::getenv(name.c_str());
  if (value == nullptr)
    document.fail(at, fmt::format("the environment variable {} in '{}' is not set; set it or write the path out",
                                  printable(name), key));
  return value;
}

}  // namespace

std::string absolute_job_path(const std::string& path) { return os::absolute(path, "."); }

std::string expanded_path(const Document& document, const std::string& written, Position at, const std::string& key) {
  if (written.empty()) document.fail(at, fmt::format("'{}' is empty; expected a path", key));
  std::string out;
  std::size_t i = 0;
  if (written == "~" || written.starts_with("~/")) {
    out = environment(document, "HOME", at, key);
    i = 1;
  }
  while (i < written.size()) {
    if (written.compare(i, 2, "${") != 0) {
      out += written[i++];
      continue;
    }
    const std::size_t end = written.find('}', i);
    if (end == std::string::npos || end == i + 2)
      document.fail(at, fmt::format("'${{' without a name and '}}' in '{}'; expected ${{NAME}}", key));
    out += environment(document, written.substr(i + 2, end - i - 2), at, key);
    i = end + 1;
  }
  if (out.empty()) document.fail(at, fmt::format("'{}' is empty once its variables are filled in", key));
  std::string full = os::absolute(out, os::folder_of(absolute_job_path(document.name())));
  while (full.size() > 1 && full.back() == '/') full.pop_back();
  return full;
}

}  // namespace windrow::job
