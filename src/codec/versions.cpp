#include <isa-l.h>
#include <libdeflate.h>
#include <xxhash.h>
#include <zstd.h>

#include "windrow/codec/codec.h"

namespace windrow::codec {

std::string library_version() {
  const unsigned xxh = XXH_versionNumber();
  return "ISA-L " + std::to_string(ISAL_MAJOR_VERSION) + "." + std::to_string(ISAL_MINOR_VERSION) + "." +
         std::to_string(ISAL_PATCH_VERSION) + ", libdeflate " LIBDEFLATE_VERSION_STRING ", zstd " +
         ZSTD_versionString() + ", xxHash " + std::to_string(xxh / 10000) + "." + std::to_string(xxh / 100 % 100) +
         "." + std::to_string(xxh % 100);
}

}  // namespace windrow::codec
