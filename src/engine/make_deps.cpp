#include "make_deps.h"

#include "windrow/os/files.h"

namespace windrow::engine {
namespace {

std::string escaped(const std::string& path) {
  std::string out;
  for (const char c : path) {
    if (c == '$') out += '$';
    if (c == ' ' || c == '#') out += '\\';
    out += c;
  }
  return out;
}

}  // namespace

void write_make_deps(const std::string& path, const std::vector<Product>& products, const std::string& job_file) {
  std::string text;
  for (const auto& product : products) {
    text += escaped(product.path) + ": " + escaped(job_file);
    for (const auto& input : product.inputs) text += " \\\n  " + escaped(input);
    text += "\n";
  }
  if (!os::state(path) || os::read_text(path) != text) os::replace_file(path, text);
}

}  // namespace windrow::engine
