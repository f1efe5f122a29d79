#include "mapping_attributes.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "proj_handles.h"
#include "windrow/base/error.h"

namespace windrow::geo {
namespace {

/// Half a metre in a radius: what rounding in a file explains and two different ellipsoids exceed.
constexpr double kSameRadius_m = 0.5;

struct Ellipsoid {
  double a = 0, rf = 0;  ///< rf 0: sphere
};

struct DestroyList {
  void operator()(PJ_OBJ_LIST* l) const { proj_list_destroy(l); }
};

/// The object of that kind whose name, or an alias of it, is just this; null for none.
Pj named(PJ_CONTEXT* context, const std::string& name, PJ_TYPE type) {
  std::string spaced = name;
  std::replace(spaced.begin(), spaced.end(), '_', ' ');  // WKT 1 wrote names so
  for (const std::string& attempt : {name, spaced}) {
    const std::unique_ptr<PJ_OBJ_LIST, DestroyList> found(
        proj_create_from_name(context, nullptr, attempt.c_str(), &type, 1, 0, 1, nullptr));
    if (found && proj_list_get_count(found.get()) > 0) return Pj(proj_list_get(context, found.get(), 0));
  }
  return nullptr;
}

std::optional<Ellipsoid> named_ellipsoid(const MappingAttributes& attributes) {
  const Context context = make_context();
  PJ_CONTEXT* c = context.get();
  const std::pair<const char*, PJ_TYPE> sources[] = {{"reference_ellipsoid_name", PJ_TYPE_ELLIPSOID},
                                                     {"horizontal_datum_name", PJ_TYPE_GEODETIC_REFERENCE_FRAME},
                                                     {"geographic_crs_name", PJ_TYPE_GEOGRAPHIC_2D_CRS}};
  for (const auto& [key, type] : sources) {
    const auto name = attributes.text(key);
    if (!name) continue;
    Pj found = named(c, *name, type);
    if (found && type != PJ_TYPE_ELLIPSOID) found.reset(proj_get_ellipsoid(c, found.get()));
    Ellipsoid out;
    double b = 0;
    int computed = 0;
    if (found && proj_ellipsoid_get_parameters(c, found.get(), &out.a, &b, &computed, &out.rf)) return out;
  }
  return std::nullopt;
}

std::optional<Ellipsoid> numbered_ellipsoid(const MappingAttributes& attributes) {
  const auto radius = attributes.number("earth_radius"), a = attributes.number("semi_major_axis"),
             b = attributes.number("semi_minor_axis"), rf = attributes.number("inverse_flattening");
  for (const char* key : {"earth_radius", "semi_major_axis", "semi_minor_axis"})
    if (const auto value = attributes.number(key); value && *value <= 0)
      attributes.fail(fmt::format("has {} {}; expected a positive length in metres", key, *value));
  if (rf && *rf != 0 && *rf <= 1)
    attributes.fail(fmt::format("has inverse_flattening {}; expected a number above 1, or 0 for a sphere", *rf));
  if (a && b && *b > *a + kSameRadius_m)
    attributes.fail(fmt::format("has semi_minor_axis {}, above semi_major_axis {}", *b, *a));
  const double flattened = a && rf ? (*rf == 0 ? *a : *a * (1 - 1 / *rf)) : 0;
  if (a && rf && b && std::abs(flattened - *b) > kSameRadius_m)
    attributes.fail(fmt::format("has semi_minor_axis {}, but {:.3f} by its inverse_flattening {}; expected the same",
                                *b, flattened, *rf));
  std::optional<Ellipsoid> out;
  if (a && rf) out = Ellipsoid{*a, *rf};
  if (a && b && !rf) out = Ellipsoid{*a, *a - *b <= 0 ? 0 : *a / (*a - *b)};
  if (!radius) return out;
  const double polar = out && out->rf != 0 ? out->a * (1 - 1 / out->rf) : out ? out->a : *radius;
  // A radius beside an ellipsoid may be any mean of its axes.
  if (out && (*radius > out->a + kSameRadius_m || *radius < polar - kSameRadius_m))
    attributes.fail(fmt::format("has earth_radius {} beside an ellipsoid of {} and {:.3f}; expected one of them",
                                *radius, out->a, polar));
  return out ? out : Ellipsoid{*radius, 0};
}

double prime_meridian(const MappingAttributes& attributes) {
  if (const auto longitude = attributes.number("longitude_of_prime_meridian")) return *longitude;
  const auto name = attributes.text("prime_meridian_name");
  if (!name) return 0;
  const Context context = make_context();
  const Pj found = named(context.get(), *name, PJ_TYPE_PRIME_MERIDIAN);
  double longitude = 0, factor = 1;
  const char* unit = nullptr;
  if (!found || !proj_prime_meridian_get_parameters(context.get(), found.get(), &longitude, &factor, &unit))
    attributes.fail(
        fmt::format("has a prime_meridian_name '{}' that PROJ does not know; expected "
                    "longitude_of_prime_meridian beside it",
                    *name));
  constexpr double kDegree = 0.017453292519943295;
  return unit && std::string(unit) == "degree" ? longitude : longitude * factor / kDegree;
}

}  // namespace

const MappingAttributes::Value* MappingAttributes::find(const std::string& key) const {
  for (const auto& [name, value] : mapping_->attributes)
    if (name == key) return &value;
  return nullptr;
}

void MappingAttributes::fail(const std::string& message) const {
  throw Error(Failure::data, *place_, fmt::format("grid mapping '{}' {}", name(), message));
}

std::optional<std::string> MappingAttributes::text(const std::string& key) const {
  const Value* value = find(key);
  if (value == nullptr) return std::nullopt;
  const auto* text = std::get_if<std::string>(value);
  if (text == nullptr) fail(fmt::format("has a {} that is no text", key));
  return text->empty() ? std::nullopt : std::optional(*text);
}

std::vector<double> MappingAttributes::numbers(const std::string& key) const {
  const Value* value = find(key);
  if (value == nullptr) return {};
  std::vector<double> out;
  if (const auto* one = std::get_if<double>(value)) out = {*one};
  if (const auto* several = std::get_if<std::vector<double>>(value)) out = *several;
  if (out.empty() || !std::all_of(out.begin(), out.end(), [](double v) { return std::isfinite(v); }))
    fail(fmt::format("has a {} that is no number", key));
  return out;
}

std::optional<double> MappingAttributes::number(const std::string& key) const {
  const std::vector<double> all = numbers(key);
  if (all.size() > 1) fail(fmt::format("has {} values of {}; expected one", all.size(), key));
  return all.empty() ? std::nullopt : std::optional(all.front());
}

double MappingAttributes::required(const std::string& key) const {
  const auto value = number(key);
  if (!value) fail(fmt::format("has no {}; {}", key, kAddCrs));
  return *value;
}

std::string earth_shape(const MappingAttributes& attributes) {
  auto ellipsoid = numbered_ellipsoid(attributes);
  if (!ellipsoid) ellipsoid = named_ellipsoid(attributes);
  if (!ellipsoid)
    attributes.fail(
        fmt::format("does not say the earth's shape (earth_radius, or semi_major_axis with "
                    "inverse_flattening or semi_minor_axis); {}",
                    kAddCrs));
  const std::string shape = ellipsoid->rf == 0 ? fmt::format(" +R={}", ellipsoid->a)
                                               : fmt::format(" +a={} +rf={}", ellipsoid->a, ellipsoid->rf);
  const double meridian = prime_meridian(attributes);
  return meridian == 0 ? shape : shape + fmt::format(" +pm={}", meridian);
}

}  // namespace windrow::geo
