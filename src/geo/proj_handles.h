// Owning handles for PROJ objects and the one way of making a context (silent, offline). No geometry here.
#pragma once
#include <proj.h>

#include <memory>
#include <new>
#include <string>

namespace windrow::geo {

struct DestroyContext {
  void operator()(PJ_CONTEXT* c) const { proj_context_destroy(c); }
};
struct DestroyPj {
  void operator()(PJ* p) const { proj_destroy(p); }
};
using Context = std::unique_ptr<PJ_CONTEXT, DestroyContext>;
using Pj = std::unique_ptr<PJ, DestroyPj>;

/// A context that writes nothing to the terminal and never asks the network. One a thread.
inline Context make_context() {
  Context context(proj_context_create());
  if (!context) throw std::bad_alloc();
  proj_context_set_enable_network(context.get(), 0);
  proj_log_func(context.get(), nullptr, [](void*, int, const char*) {});
  return context;
}

/// The horizontal CRS a definition means, without any attached datum shift, or null. `definition` is complete
/// (PROJ strings carry +type=crs).
Pj create_crs(PJ_CONTEXT* context, const std::string& definition);

}  // namespace windrow::geo
