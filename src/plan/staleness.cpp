#include "windrow/plan/staleness.h"

#include <map>

namespace windrow::plan {

std::string why_stale(const Found& found, const Key& wanted) {
  if (!found.product) return "not made yet";
  if (!found.key) return "no ledger";
  if (*found.key == wanted) return {};
  std::map<std::string, codec::Digest> before(found.key->parts.begin(), found.key->parts.end());
  for (const auto& [name, digest] : wanted.parts) {
    const auto old = before.find(name);
    if (old == before.end()) return name + " is new";
    if (old->second != digest) return name + " changed";
    before.erase(old);
  }
  return before.empty() ? "order of inputs changed" : before.begin()->first + " is no longer used";
}

}  // namespace windrow::plan
