#include <libdeflate.h>
#include <xxhash.h>
#include <zstd.h>

#include "windrow/codec/codec.h"

namespace windrow::codec {

std::string library_version() {
  const unsigned xxh = XXH_versionNumber();
  return std::string("libdeflate " LIBDEFLATE_VERSION_STRING ", zstd ") + ZSTD_versionString() + ", xxHash " +
         std::to_string(xxh / 10000) + "." + std::to_string(xxh / 100 % 100) + "." + std::to_string(xxh % 100);
}

}  // namespace windrow::codec
