// Reading a product back as it is stored, for checks: no unpacking, no CF meaning.
#include <fmt/format.h>

#include <algorithm>

#include "nc_file.h"
#include "signature.h"
#include "windrow/base/error.h"
#include "windrow/cf/product.h"

namespace windrow::cf {
namespace {

class Reader final : public ProductReader {
 public:
  explicit Reader(const std::string& path)
      : file_(nc::File::open(path)), dims_(file_.dimensions()), variables_(file_.variables()) {}

  [[nodiscard]] std::vector<Attribute> global_attributes() const override { return records(file_.global_attributes()); }

  [[nodiscard]] std::vector<std::string> variables() const override {
    std::vector<std::string> out;
    for (const auto& v : variables_) out.push_back(v.name);
    return out;
  }

  [[nodiscard]] std::vector<Attribute> attributes(const std::string& variable) const override {
    return records(find(variable).attributes);
  }

  [[nodiscard]] std::vector<Dimension> dimensions(const std::string& variable) const override {
    std::vector<Dimension> out;
    for (const int id : find(variable).dims) {
      const auto dim = std::find_if(dims_.begin(), dims_.end(), [&](const nc::Dim& d) { return d.id == id; });
      if (dim == dims_.end()) throw Error(Failure::data, file_.path(), "a variable uses an unknown dimension");
      out.push_back({dim->name, dim->length, dim->unlimited});
    }
    return out;
  }

  [[nodiscard]] std::vector<double> values(const std::string& variable) const override {
    return file_.doubles(find(variable));
  }

  void read_steps(const std::string& variable, std::size_t t0, std::size_t t1, std::vector<float>& out) const override {
    const auto dims = dimensions(variable);
    if (dims.empty() || t0 > t1 || t1 > dims[0].length)
      throw Error(Failure::defect, file_.path(), fmt::format("'{}' has no steps {} to {}", variable, t0, t1));
    std::vector<std::size_t> start(dims.size(), 0), count;
    for (const Dimension& d : dims) count.push_back(d.length);
    start[0] = t0;
    count[0] = t1 - t0;
    read_window(variable, start, count, out);
  }

  void read_window(const std::string& variable, const std::vector<std::size_t>& start,
                   const std::vector<std::size_t>& count, std::vector<float>& out) const override {
    const nc::Var& v = find(variable);
    const auto dims = dimensions(variable);
    bool inside = start.size() == dims.size() && count.size() == dims.size();
    for (std::size_t i = 0; inside && i < dims.size(); ++i) inside = start[i] + count[i] <= dims[i].length;
    if (!inside) throw Error(Failure::defect, file_.path(), fmt::format("'{}' has no such window", variable));
    std::size_t size = 1;
    for (const std::size_t n : count) size *= n;
    out.resize(size);
    if (size == 0) return;
    const nc::LibraryLock lock;
    nc::check(nc_get_vara_float(file_.id(), v.id, start.data(), count.data(), out.data()), file_.path(),
              "variable " + variable);
  }

 private:
  static std::vector<Attribute> records(const std::vector<nc::Att>& attributes) {
    std::vector<Attribute> out;
    for (const auto& a : attributes) out.push_back(nc::to_record(a));
    return out;
  }

  const nc::Var& find(const std::string& name) const {
    const auto found =
        std::find_if(variables_.begin(), variables_.end(), [&](const auto& v) { return v.name == name; });
    if (found == variables_.end())
      throw Error(Failure::data, file_.path(), fmt::format("there is no variable '{}'", name));
    return *found;
  }

  nc::File file_;
  std::vector<nc::Dim> dims_;
  std::vector<nc::Var> variables_;
};

}  // namespace

std::unique_ptr<ProductReader> open_product(const std::string& path) {
  check_readable(path);
  return std::make_unique<Reader>(path);
}

}  // namespace windrow::cf
