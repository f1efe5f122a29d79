#include "regridding.h"

#include <fmt/format.h>

#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/os/files.h"
#include "windrow/overlap/methods.h"
#include "windrow/overlap/overlap.h"

namespace windrow::engine {
namespace {

using linear_map::LinearMap;
using linear_map::Quantity;

// Part of every map's name: a change of the geometry code that changes shares must change it.
constexpr const char* kMapFormat = "linear map, format 2";

const char* word_of(Quantity quantity) { return quantity == Quantity::mean ? "mean" : "total"; }

std::string key_of(const mesh::Mesh& source, const mesh::Mesh& target, const std::string& method) {
  return codec::Hasher()
      .add(std::string(kMapFormat))
      .add(source.digest().hex())
      .add(target.digest().hex())
      .add(method)
      .finish()
      .hex();
}

void add_closure(LinearMap& map, const overlap::Closure& closure) {
  map.provenance += fmt::format(
      "; row sums within {:.2e} (bound there {:.2e}, {} rows), column sums within {:.2e} "
      "(bound there {:.2e}, {} columns), before normalising",
      closure.worst_row, closure.worst_row_bound, closure.rows_checked, closure.worst_column,
      closure.worst_column_bound, closure.columns_checked);
}

LinearMap finished(overlap::Result result) {
  add_closure(result.map, result.closure);
  return std::move(result.map);
}

LinearMap at_points(const mesh::Mesh& source, const mesh::Mesh& target) {
  std::vector<GeoPoint> points;
  for (std::size_t k = 0; k < target.size(); ++k) points.push_back(target.centre(k));
  return overlap::containing(source, points);
}

/// Maps made at points carry no areas; what sums over the mesh needs them.
LinearMap with_areas(LinearMap map, const mesh::Mesh& source, const mesh::Mesh& target) {
  map.row_area.clear();
  map.column_area.clear();
  for (std::size_t k = 0; k < target.size(); ++k) map.row_area.push_back(target.area(k));
  for (std::size_t k = 0; k < source.size(); ++k) map.column_area.push_back(source.area(k));
  return map;
}

}  // namespace

const char* name_of(job::Method method) {
  switch (method) {
    case job::Method::conservative_1:
      return "conservative-1";
    case job::Method::conservative_2:
      return "conservative-2";
    case job::Method::conservative_smooth:
      return "conservative-smooth";
    case job::Method::bilinear:
      return "bilinear";
    case job::Method::nearest:
      return "nearest";
    case job::Method::majority:
      return "majority";
  }
  return "";
}

MapPtr MapStore::kept(const mesh::Mesh& source, const mesh::Mesh& target, const std::string& method,
                      const std::function<LinearMap()>& make) {
  const auto key = key_of(source, target, method);
  if (const auto found = held_.find(key); found != held_.end()) return found->second;
  auto map = std::make_shared<LinearMap>();
  const std::string path = folder_.empty() ? "" : fmt::format("{}/{}.map", folder_, key);
  const bool stored = !path.empty() && os::state(path) && linear_map::parse(os::read_bytes(path), *map);
  if (!stored) {
    *map = make();
    if (!path.empty()) {
      os::make_folder(folder_);
      os::replace_file(path, linear_map::serialise(*map));
    }
  }
  held_[key] = map;
  return map;
}

MapPtr MapStore::conservative(const mesh::Mesh& source, const mesh::Mesh& target, Quantity quantity) {
  return kept(source, target, fmt::format("conservative-1 {}", word_of(quantity)),
              [&] { return finished(overlap::conservative(source, target, quantity)); });
}

Regridding MapStore::regrid(job::Method method, const mesh::Mesh& source, const mesh::Mesh& target, Quantity quantity,
                            bool non_negative) {
  Regridding out;
  const std::string word = fmt::format("{} {}", name_of(method), word_of(quantity));
  const bool sampled = method == job::Method::bilinear || method == job::Method::nearest;
  out.keeps_integrals = !sampled && method != job::Method::majority && target.has_area();
  if (!target.has_area() && !sampled) {
    out.map =
        kept(source, target, "containing cell", [&] { return with_areas(at_points(source, target), source, target); });
    return out;
  }
  switch (method) {
    case job::Method::conservative_1:
      out.map = conservative(source, target, quantity);
      break;
    case job::Method::majority:
      out.map = conservative(source, target, quantity);
      out.categories = true;
      break;
    case job::Method::conservative_2:
      out.map =
          kept(source, target, word, [&] { return finished(overlap::conservative_linear(source, target, quantity)); });
      out.extension = overlap::make_gradient(source, quantity, true);
      break;
    case job::Method::bilinear:
      out.map =
          kept(source, target, word, [&] { return with_areas(overlap::bilinear(source, target), source, target); });
      break;
    case job::Method::nearest:
      out.map =
          kept(source, target, word, [&] { return with_areas(overlap::nearest(source, target), source, target); });
      break;
    case job::Method::conservative_smooth: {
      if (quantity == Quantity::total) {
        throw Error(Failure::data, source.describe(), "conservative-smooth takes means; expected quantity = \"mean\"");
      }
      out.map = kept(source, target, word, [&] {
        auto smooth = overlap::conservative_smooth(source, target, non_negative);
        add_closure(smooth.map, smooth.closure);
        return std::move(smooth.map);
      });
      out.extension = overlap::make_multipliers(*out.map, non_negative);
      break;
    }
  }
  return out;
}

}  // namespace windrow::engine
