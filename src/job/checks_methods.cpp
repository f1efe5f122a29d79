// What a regridding method, a vector pair and a kind of mesh go with.
#include <fmt/format.h>

#include "checks.h"
#include "sections.h"

namespace windrow::job {
namespace {

bool conserves(Method method) {
  return method == Method::conservative_1 || method == Method::conservative_2 || method == Method::conservative_smooth;
}

void check_total(const Table& table, const FieldSpec& field, MeshKind kind) {
  if (!field.total) return;
  if (!conserves(field.method))
    table.fail("quantity", fmt::format("a cell sum is kept by the conservative methods only, not by '{}'; expected "
                                       "method \"conservative-1\" or quantity \"mean\"",
                                       method_word(field.method)));
  if (kind == MeshKind::towns)
    table.fail("quantity", "a cell sum has no value at a point; expected quantity \"mean\" with mesh kind 'towns'");
}

void check_majority(const Table& table, const FieldSpec& field) {
  if (field.method != Method::majority) return;
  if (field.adjust.method != Adjustment::none)
    table.fail("method",
               "'majority' is for categories, which cannot be adjusted to stations; expected another method, "
               "or no [field.adjust]");
  if (field.terrain)
    table.fail("method",
               "'majority' is for categories, which do not change with height; expected another method, or no "
               "[field.terrain]");
}

void check_towns(const Table& table, const FieldSpec& field, MeshKind kind) {
  if (kind != MeshKind::towns) return;
  if (field.method != Method::conservative_1 && field.method != Method::bilinear && field.method != Method::nearest)
    table.fail("method", fmt::format("'{}' needs cells with an area, and towns are points; expected bilinear, nearest "
                                     "or conservative-1 (the value of the cell that holds the town)",
                                     method_word(field.method)));
  if (field.min_land > 0)
    table.fail("min_land", "'min_land' is a share of an area, and towns are points; leave it out");
}

void check_axes(const Table& table, const FieldSpec& field, MeshKind kind) {
  if (!table.has("axes")) return;
  if (field.pair == Pair::none)
    table.fail("axes", "'axes' goes with the components of a vector; expected 'pair' beside it");
  if (field.axes == VectorAxes::mesh && !is_structured(kind))
    table.fail("axes",
               fmt::format("cells of mesh kind '{}' have no axes; expected axes \"east-north\"", kind_word(kind)));
}

void check_component(const Table& table, const FieldSpec& field) {
  if (field.pair == Pair::none) return;
  if (field.adjust.method != Adjustment::none)
    table.fail("adjust",
               "a component of a vector cannot be adjusted alone, which would turn it; expected no 'pair' or "
               "no [field.adjust]");
  if (field.terrain)
    table.fail("terrain",
               "a component of a vector does not change with height alone, which would turn it; expected no "
               "'pair' or no [field.terrain]");
  if (field.method == Method::majority || field.method == Method::conservative_smooth)
    table.fail("method",
               fmt::format("'{}' does not go with 'pair'; expected conservative-1, conservative-2, bilinear or "
                           "nearest",
                           method_word(field.method)));
  if (field.total)
    table.fail("quantity",
               "a vector has a direction at each place and no sum over a cell; expected quantity \"mean\" "
               "with 'pair'");
}

std::string pair_word(Pair pair) { return pair == Pair::eastward ? "eastward" : "northward"; }

// The first key in which two components are not regridded alike, or empty.
std::string difference(const FieldSpec& a, const FieldSpec& b) {
  if (a.method != b.method) return "method";
  if (a.units != b.units) return "units";
  if (a.min_cover != b.min_cover) return "min_cover";
  if (a.min_land != b.min_land) return "min_land";
  if (a.fill_nearest != b.fill_nearest) return "fill";
  if (a.axes != b.axes) return "axes";
  return "";
}

}  // namespace

void check_methods(const Tables& tables, const JobSpec& job) {
  for (std::size_t i = 0; i < job.fields.size(); ++i) {
    const FieldSpec& field = job.fields[i];
    const Table& table = tables.fields[i];
    check_total(table, field, job.mesh.kind);
    check_majority(table, field);
    check_towns(table, field, job.mesh.kind);
    check_axes(table, field, job.mesh.kind);
    check_component(table, field);
  }
}

void check_pairs(const Tables& tables, const JobSpec& job) {
  std::vector<std::size_t> components;
  for (std::size_t i = 0; i < job.fields.size(); ++i) {
    if (job.fields[i].pair == Pair::none) continue;
    for (const std::size_t earlier : components)
      if (job.fields[earlier].pair == job.fields[i].pair)
        tables.fields[i].fail("pair",
                              fmt::format("fields '{}' and '{}' are both {}; expected one eastward and one "
                                          "northward field in a job",
                                          job.fields[earlier].name, job.fields[i].name, pair_word(job.fields[i].pair)));
    components.push_back(i);
  }
  if (components.empty()) return;
  const std::size_t first = components.front(), last = components.back();
  const FieldSpec &a = job.fields[first], &b = job.fields[last];
  if (components.size() == 1)
    tables.fields[first].fail(
        "pair", fmt::format("field '{}' is {} and has no partner; expected a {} field as well", a.name,
                            pair_word(a.pair), pair_word(a.pair == Pair::eastward ? Pair::northward : Pair::eastward)));
  const std::string key = difference(a, b);
  if (!key.empty()) {
    const Table& table = tables.fields[tables.fields[last].has(key) ? last : first];
    table.fail(key, fmt::format("the pair '{}' and '{}' differ in '{}'; expected the same for both components", a.name,
                                b.name, key));
  }
}

}  // namespace windrow::job
