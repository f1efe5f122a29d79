// Projectors: a pool of PROJ operations, each with a context of its own, so that any number of threads may project.
#include "projector.h"

#include <cmath>
#include <limits>
#include <mutex>
#include <vector>

#include "proj_handles.h"
#include "windrow/base/error.h"

namespace windrow::geo {
namespace {

struct Operation {
  Context context;
  Pj pj;
};

/// Base geographic CRS -> projected CRS, x east and y north: the CRS's own conversion, so no datum shift can slip in.
Operation make_operation(const std::string& definition, const std::string& place) {
  Operation op{make_context(), nullptr};
  PJ_CONTEXT* c = op.context.get();
  const Pj crs = create_crs(c, definition);
  const Pj base(crs ? proj_crs_get_geodetic_crs(c, crs.get()) : nullptr);
  const Pj raw(base ? proj_create_crs_to_crs_from_pj(c, base.get(), crs.get(), nullptr, nullptr) : nullptr);
  if (raw) op.pj.reset(proj_normalize_for_visualization(c, raw.get()));
  if (!op.pj)
    throw Error(Failure::job, place,
                "PROJ cannot project with this coordinate reference system (" +
                    std::string(proj_context_errno_string(c, proj_context_errno(c))) + ")");
  return op;
}

class Pool {
 public:
  Pool(std::string definition, std::string place, BaseAngles angles)
      : definition_(std::move(definition)), place_(std::move(place)), angles_(angles) {
    free_.push_back(make_operation(definition_, place_));
  }

  void to_geographic(std::vector<double>& x, std::vector<double>& y) {
    transform(PJ_INV, x, y);
    for (double& v : x) v = v * angles_.degrees_per_unit + angles_.prime_meridian_deg;
    for (double& v : y) v *= angles_.degrees_per_unit;
  }

  void from_geographic(std::vector<double>& x, std::vector<double>& y) {
    for (double& v : x) v = (v - angles_.prime_meridian_deg) / angles_.degrees_per_unit;
    for (double& v : y) v /= angles_.degrees_per_unit;
    transform(PJ_FWD, x, y);
  }

 private:
  void transform(PJ_DIRECTION direction, std::vector<double>& x, std::vector<double>& y) {
    if (x.size() != y.size()) throw Error(Failure::defect, "projector", "x and y differ in length");
    if (x.empty()) return;
    Operation op = borrow();
    proj_errno_reset(op.pj.get());
    proj_trans_generic(op.pj.get(), direction, x.data(), sizeof(double), x.size(), y.data(), sizeof(double), y.size(),
                       nullptr, 0, 0, nullptr, 0, 0);
    give_back(std::move(op));
    for (std::size_t i = 0; i < x.size(); ++i)
      if (!std::isfinite(x[i]) || !std::isfinite(y[i])) x[i] = y[i] = std::numeric_limits<double>::quiet_NaN();
  }

  Operation borrow() {
    {
      const std::scoped_lock lock(mutex_);
      if (!free_.empty()) {
        Operation op = std::move(free_.back());
        free_.pop_back();
        return op;
      }
    }
    return make_operation(definition_, place_);
  }

  void give_back(Operation op) {
    const std::scoped_lock lock(mutex_);
    free_.push_back(std::move(op));
  }

  std::string definition_, place_;
  BaseAngles angles_;
  std::mutex mutex_;
  std::vector<Operation> free_;
};

}  // namespace

ProjectorPair make_projected_pair(const std::string& definition, const BaseAngles& angles, const std::string& place) {
  const auto pool = std::make_shared<Pool>(definition, place, angles);
  return {[pool](std::vector<double>& x, std::vector<double>& y) { pool->to_geographic(x, y); },
          [pool](std::vector<double>& x, std::vector<double>& y) { pool->from_geographic(x, y); }};
}

ProjectorPair make_geographic_pair(const BaseAngles& angles) {
  return {[angles](std::vector<double>& x, std::vector<double>& y) {
            for (double& v : x) v = v * angles.degrees_per_unit + angles.prime_meridian_deg;
            for (double& v : y) v *= angles.degrees_per_unit;
          },
          [angles](std::vector<double>& x, std::vector<double>& y) {
            for (double& v : x) v = (v - angles.prime_meridian_deg) / angles.degrees_per_unit;
            for (double& v : y) v /= angles.degrees_per_unit;
          }};
}

}  // namespace windrow::geo
