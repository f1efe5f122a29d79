#include <gdal.h>
#include <proj.h>

#include "windrow/geo/crs.h"

namespace windrow::geo {

std::string library_version() {
  return std::string("PROJ ") + proj_info().version + ", GDAL " + GDALVersionInfo("RELEASE_NAME");
}

}  // namespace windrow::geo
