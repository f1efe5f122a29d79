// Is a product up to date, and if not, why? Pure: works on digests that others read.
#pragma once
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "windrow/codec/digest.h"

namespace windrow::plan {

/// Everything a product's bytes depend on, in named parts so that a difference can be told.
struct Key {
  std::vector<std::pair<std::string, codec::Digest>> parts;  ///< ("settings", ...), ("in/heron_all_1981.nc", ...)
  bool operator==(const Key&) const = default;
};

/// What was found of an earlier product; nothing when there is none under its name.
struct Found {
  bool product = false;          ///< the file exists with the size its ledger states
  std::optional<Key> key;        ///< from its ledger
};

/// Empty when up to date, otherwise one line: "not made yet", "no ledger", "settings changed",
/// "in/heron_all_1981.nc changed", "in/new.nc is new", "in/old.nc is no longer used".
std::string why_stale(const Found& found, const Key& wanted);

}  // namespace windrow::plan
